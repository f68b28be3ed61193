// Time per zone of the rates and the Jacobian of adm1, by number of zones.
#include <benchmark/benchmark.h>

#include <optional>
#include <stdexcept>
#include <vector>

#include "core/units.hpp"
#include "kinetics/kinetic_model.hpp"
#include "kinetics/zone_kinetics.hpp"

namespace stillzone::kinetics {
namespace {

KineticModel adm1() {
  core::FaultList faults;
  const core::UnitReader units;
  const auto document = core::JsonDocument::parse(shipped_model_text("adm1"), "adm1", ".", faults);
  if (!document) throw std::runtime_error(faults.text());
  std::optional<KineticModel> model = read_model(*document, units, faults);
  if (!model) throw std::runtime_error(faults.text());
  return std::move(*model);
}

/// Zones near the model's inoculum, each a little different.
struct Zones {
  Zones(const KineticModel& model, std::size_t n) : conditions(n) {
    for (std::size_t z = 0; z < n; ++z) {
      const double factor = 1.0 + 0.01 * static_cast<double>(z % 17);
      conditions[z].gas_transfer = 200.0;
      for (const Component& c : model.components) unknowns.push_back(c.seed * factor);
      for (const Implicit& i : model.implicits) unknowns.push_back(i.start);
      for (const Gas& g : model.gases) gases.push_back(g.seed * factor);
    }
  }
  std::vector<ZoneConditions> conditions;
  std::vector<double> unknowns;
  std::vector<double> gases;
};

void per_zone(benchmark::State& state) {
  using Counter = benchmark::Counter;
  state.counters["per_zone"] = Counter(static_cast<double>(state.range(0)),
                                       Counter::kIsIterationInvariantRate | Counter::kInvert);
}

void adm1_rates(benchmark::State& state) {
  const KineticModel model = adm1();
  const auto n = static_cast<std::size_t>(state.range(0));
  const Zones zones(model, n);
  ZoneKinetics kinetics(model, zones.conditions);
  std::vector<double> source(zones.unknowns.size()), transfer(zones.gases.size());
  for (auto _ : state) {
    kinetics.rates(zones.unknowns, zones.gases, source, transfer);
    benchmark::ClobberMemory();
  }
  per_zone(state);
}
BENCHMARK(adm1_rates)->Arg(1)->Arg(2)->Arg(5)->Arg(8)->Arg(20)->Arg(32)->Arg(100)->Arg(1000);

void adm1_jacobian(benchmark::State& state) {
  const KineticModel model = adm1();
  const auto n = static_cast<std::size_t>(state.range(0));
  const Zones zones(model, n);
  ZoneKinetics kinetics(model, zones.conditions);
  std::vector<double> values(n * kinetics.pattern().size());
  for (auto _ : state) {
    kinetics.jacobian(zones.unknowns, zones.gases, values);
    benchmark::ClobberMemory();
  }
  per_zone(state);
  state.counters["entries"] = static_cast<double>(kinetics.pattern().size());
}
BENCHMARK(adm1_jacobian)->Arg(1)->Arg(2)->Arg(5)->Arg(8)->Arg(20)->Arg(32)->Arg(100)->Arg(1000);

void adm1_ph(benchmark::State& state) {
  const KineticModel model = adm1();
  const auto n = static_cast<std::size_t>(state.range(0));
  Zones zones(model, n);
  ZoneKinetics kinetics(model, zones.conditions);
  const std::vector<double> start = zones.unknowns;
  for (auto _ : state) {
    zones.unknowns = start;
    if (!kinetics.solve_implicits(zones.unknowns).ok()) state.SkipWithError("no pH found");
  }
  per_zone(state);
}
BENCHMARK(adm1_ph)->Arg(1)->Arg(100);

void adm1_read(benchmark::State& state) {
  for (auto _ : state) benchmark::DoNotOptimize(adm1());
}
BENCHMARK(adm1_read)->Unit(benchmark::kMillisecond);

void adm1_compile(benchmark::State& state) {
  const KineticModel model = adm1();
  for (auto _ : state) {
    const ZoneKinetics kinetics(model, std::vector<ZoneConditions>(1));
    benchmark::DoNotOptimize(kinetics.pattern().data());
  }
}
BENCHMARK(adm1_compile)->Unit(benchmark::kMillisecond);

}  // namespace
}  // namespace stillzone::kinetics
