#include "kinetics/zone_kinetics.hpp"

#include <array>
#include <cmath>

#include "core/require.hpp"
#include "kinetics/implicit_solver.hpp"
#include "kinetics/kinetic_tapes.hpp"

namespace stillzone::kinetics {

namespace {

constexpr std::size_t kConditions = 3;

}  // namespace

struct ZoneKinetics::Impl {
  Impl(const KineticModel& kinetic_model, std::size_t zones)
      : model(kinetic_model),
        tapes(*kinetic_model.program),
        n_zones(zones),
        n_unknowns(kinetic_model.n_zone_unknowns()),
        n_gases(kinetic_model.gases.size()),
        fixed(zones * tapes.n_fixed, 0.0),
        conditions(zones * kConditions, 0.0),
        no_gas(n_gases, 0.0),
        scratch(tapes.scratch_lines()) {}

  void check(std::size_t size, std::size_t per_zone, const char* what) const {
    SZ_REQUIRE(size == n_zones * per_zone, "{}: {} values for {} zones of {}", what, size, n_zones,
               per_zone);
  }

  void run(KineticTapes::Which which, std::span<const double> unknowns, TapeInput gases,
           TapeOutput first, TapeOutput second = {}) {
    const std::array<TapeInput, 3> inputs{TapeInput{unknowns.data(), n_unknowns}, gases,
                                          TapeInput{fixed.data(), tapes.n_fixed}};
    const std::array<TapeOutput, 2> outputs{first, second};
    tapes[which].run(n_zones, inputs, outputs, scratch);
  }

  const KineticModel& model;
  KineticTapes tapes;
  std::size_t n_zones;
  std::size_t n_unknowns;
  std::size_t n_gases;
  std::vector<double> fixed;       ///< n_zones * tapes.n_fixed
  std::vector<double> conditions;  ///< n_zones * {T, kLa, T_gas}
  std::vector<double> no_gas;
  std::vector<TapeScratchLine> scratch;
};

ZoneKinetics::ZoneKinetics(const KineticModel& model, std::vector<ZoneConditions> zones) {
  SZ_REQUIRE(model.program != nullptr, "model \"{}\" has no program", model.name);
  SZ_REQUIRE(model.program->n_components == model.components.size() &&
                 model.program->n_implicits == model.implicits.size() &&
                 model.program->n_gases == model.gases.size() &&
                 model.program->derived.size() == model.derived.size(),
             "model \"{}\": its program has other sizes", model.name);
  impl_ = std::make_unique<Impl>(model, zones.size());
  set_conditions(zones);
}

ZoneKinetics::~ZoneKinetics() = default;

const KineticModel& ZoneKinetics::model() const { return impl_->model; }
std::size_t ZoneKinetics::n_zones() const { return impl_->n_zones; }
std::span<const KineticEntry> ZoneKinetics::pattern() const { return impl_->tapes.pattern; }
std::size_t ZoneKinetics::n_processes() const { return impl_->model.program->processes.size(); }

void ZoneKinetics::set_conditions(std::span<const ZoneConditions> zones) {
  Impl& d = *impl_;
  d.check(zones.size(), 1, "conditions");
  for (std::size_t z = 0; z < zones.size(); ++z) {
    SZ_REQUIRE(zones[z].temperature > 0.0 && zones[z].gas_temperature > 0.0 &&
                   zones[z].gas_transfer >= 0.0,
               "zone {}: T {} K, headspace {} K, kLa {} 1/d", z, zones[z].temperature,
               zones[z].gas_temperature, zones[z].gas_transfer);
    d.conditions[z * kConditions] = zones[z].temperature;
    d.conditions[z * kConditions + 1] = zones[z].gas_transfer;
    d.conditions[z * kConditions + 2] = zones[z].gas_temperature;
  }
  const std::array<TapeInput, 1> inputs{TapeInput{d.conditions.data(), kConditions}};
  const std::array<TapeOutput, 1> outputs{TapeOutput{d.fixed.data(), d.tapes.n_fixed}};
  d.tapes[KineticTapes::fixed].run(d.n_zones, inputs, outputs, d.scratch);
}

void ZoneKinetics::rates(std::span<const double> unknowns, std::span<const double> gases,
                         std::span<double> source, std::span<double> transfer) {
  Impl& d = *impl_;
  d.check(unknowns.size(), d.n_unknowns, "unknowns");
  d.check(gases.size(), d.n_gases, "gases");
  d.check(source.size(), d.n_unknowns, "source");
  d.check(transfer.size(), d.n_gases, "transfer");
  d.run(KineticTapes::rates, unknowns, {gases.data(), d.n_gases}, {source.data(), d.n_unknowns},
        {transfer.data(), d.n_gases});
}

void ZoneKinetics::jacobian(std::span<const double> unknowns, std::span<const double> gases,
                            std::span<double> values) {
  Impl& d = *impl_;
  d.check(unknowns.size(), d.n_unknowns, "unknowns");
  d.check(gases.size(), d.n_gases, "gases");
  d.check(values.size(), d.tapes.pattern.size(), "Jacobian values");
  d.run(KineticTapes::jacobian, unknowns, {gases.data(), d.n_gases},
        {values.data(), d.tapes.pattern.size()});
}

void ZoneKinetics::process_rates(std::span<const double> unknowns, std::span<const double> gases,
                                 std::span<double> rates) {
  Impl& d = *impl_;
  d.check(unknowns.size(), d.n_unknowns, "unknowns");
  d.check(gases.size(), d.n_gases, "gases");
  d.check(rates.size(), n_processes(), "process rates");
  d.run(KineticTapes::processes, unknowns, {gases.data(), d.n_gases},
        {rates.data(), n_processes()});
}

void ZoneKinetics::derived(std::span<const double> unknowns, std::span<double> values) {
  Impl& d = *impl_;
  d.check(unknowns.size(), d.n_unknowns, "unknowns");
  d.check(values.size(), d.model.derived.size(), "derived quantities");
  d.run(KineticTapes::derived, unknowns, {d.no_gas.data(), 0},
        {values.data(), d.model.derived.size()});
}

core::Result<core::Done> ZoneKinetics::solve_implicits(std::span<double> unknowns) {
  Impl& d = *impl_;
  d.check(unknowns.size(), d.n_unknowns, "unknowns");
  const std::size_t n = d.model.implicits.size();
  if (n == 0) return core::Done{};
  std::vector<double> row(d.n_unknowns);
  for (std::size_t z = 0; z < d.n_zones; ++z) {
    const std::span<double> zone = unknowns.subspan(z * d.n_unknowns, d.n_unknowns);
    std::ranges::copy(zone, row.begin());
    // Residuals and their n x n derivatives at trial values of the implicit unknowns.
    const ImplicitFunction evaluate = [&](std::span<const double> at, std::span<double> residual,
                                          std::span<double> derivative) {
      std::ranges::copy(at, row.end() - static_cast<std::ptrdiff_t>(n));
      const std::array<TapeInput, 3> inputs{TapeInput{row.data(), 0}, TapeInput{d.no_gas.data(), 0},
                                            TapeInput{d.fixed.data() + z * d.tapes.n_fixed, 0}};
      const std::array<TapeOutput, 2> outputs{TapeOutput{residual.data(), 0},
                                              TapeOutput{derivative.data(), 0}};
      d.tapes[KineticTapes::implicits].run(1, inputs, outputs, d.scratch);
    };
    auto solved = solve_implicit_equations(d.model.implicits, zone.last(n), evaluate);
    if (!solved) {
      core::Failure failure = solved.failure();
      failure.place = fmt::format("zone number {}", z + 1);
      return failure;
    }
  }
  return core::Done{};
}

}  // namespace stillzone::kinetics
