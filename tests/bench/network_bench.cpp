// Whole digesters of adm1 zones: what a right-hand side, a Jacobian, a factorisation, 200 days, a
// steady state and a month of switching cost. "ring": zones in a ring; "grid": a 3-D mesh; both
// with exchanges of 20 times the feed between neighbours and one shared headspace. Invented data.
#include <benchmark/benchmark.h>
#include <fmt/format.h>
#include <sys/resource.h>

#include <cmath>
#include <memory>
#include <stdexcept>
#include <string>
#include <vector>

#include "core/dae/integrator.hpp"
#include "core/dae/linear_solver.hpp"
#include "core/dae/steady_state.hpp"
#include "core/units.hpp"
#include "network/digester_system.hpp"
#include "network/start_state.hpp"

namespace stillzone {
namespace {

constexpr double kFeed = 170.0;     // m3/d
constexpr double kVolume = 3400.0;  // m3

std::vector<std::pair<int, int>> ring(int n) {
  std::vector<std::pair<int, int>> pairs;
  for (int z = 0; z + 1 < n; ++z) pairs.emplace_back(z, z + 1);
  if (n > 2) pairs.emplace_back(n - 1, 0);
  return pairs;
}

/// The nearest to a cube that holds n zones, filled row by row.
std::vector<std::pair<int, int>> grid(int n) {
  const int side = static_cast<int>(std::ceil(std::cbrt(n) - 1e-9));
  std::vector<std::pair<int, int>> pairs;
  for (int z = 0; z < n; ++z) {
    if ((z + 1) % side != 0 && z + 1 < n) pairs.emplace_back(z, z + 1);
    if ((z / side + 1) % side != 0 && z + side < n) pairs.emplace_back(z, z + side);
    if (z + side * side < n) pairs.emplace_back(z, z + side * side);
  }
  return pairs;
}

std::string case_text(int n, const std::vector<std::pair<int, int>>& pairs, bool switching) {
  std::string zones;
  for (int z = 0; z < n; ++z) {
    zones +=
        fmt::format(R"({}"z{}": {{"volume": "{} m3", "gas": {{"to": "dome", "kLa": "200 1/d"}}}})",
                    z == 0 ? "" : ", ", z, kVolume / n);
  }
  std::string flows = R"({"from": "sludge", "to": "z0"}, )" +
                      fmt::format(R"({{"from": "z{}", "to": "out"}})", n - 1);
  for (const auto& [a, b] : pairs) {
    flows += fmt::format(R"(, {{"between": ["z{}", "z{}"], "flow": "{} m3/d"{}}})", a, b,
                         20.0 * kFeed, switching ? R"(, "schedule": "mixing")" : "");
  }
  const char* schedules =
      switching ? R"("schedules": {"mixing": {"every": "1 h", "on_for": "12 min", "idle": 0.05},
                     "pulse": {"every": "1 d", "on_for": "5 min"}},)"
                : "";
  return fmt::format(
      R"({{"stillzone": "case/1", "title": "bench", "kinetics": "adm1", "temperature": "35 degC",
      "zones": {{{}}}, "headspaces": {{"dome": {{"volume": "300 m3", "pipe":
      {{"coefficient": "5e4 m3/d/bar", "back_pressure": "1.013 bar"}}}}}}, {}
      "feeds": {{"sludge": {{"flow": "{} m3/d"{}, "state": {{"X_ch": 5, "X_pr": 20, "X_li": 5,
      "X_I": 25, "X_c": 2, "S_IN": 0.01, "S_IC": 0.04, "S_cat": 0.04, "S_an": 0.02}}}}}},
      "outlets": ["out"], "flows": [{}], "run": {{"kind": "steady"}}}})",
      zones, schedules, kFeed, switching ? R"(, "schedule": "pulse")" : "", flows);
}

/// A digester ready to be worked on.
struct Digester {
  explicit Digester(const std::string& text, network::Operation::Mode mode) {
    core::FaultList faults;
    const core::UnitReader units;
    const auto document = core::JsonDocument::parse(text, "bench.json", ".", faults);
    if (document) the_case = network::read_case(*document, units, faults);
    if (the_case) balance = network::FlowBalance::solve(*the_case, *document, faults);
    if (!balance) throw std::runtime_error(faults.text());
    network::DigesterSystem::Options options;
    options.mode = mode;
    system = std::make_unique<network::DigesterSystem>(*the_case, *balance, options);
    system->enter(0.0);
    auto start = network::start_state(*the_case, *system);
    if (!start) throw std::runtime_error(start.failure().text());
    y = std::move(start).value();
    solver = core::make_klu_solver(system->pattern());
  }
  std::optional<network::Case> the_case;
  std::optional<network::FlowBalance> balance;
  std::unique_ptr<network::DigesterSystem> system;
  std::unique_ptr<core::LinearSolver> solver;
  std::vector<double> y;
};

Digester digester(const benchmark::State& state) {
  const int n = static_cast<int>(state.range(0));
  return Digester(case_text(n, state.range(1) == 0 ? ring(n) : grid(n), false),
                  network::Operation::Mode::scheduled);
}

/// Of the process so far: a row's own only when it runs alone (--benchmark_filter).
void report_memory(benchmark::State& state) {
  rusage usage{};
  getrusage(RUSAGE_SELF, &usage);
  state.counters["peak_MB"] = static_cast<double>(usage.ru_maxrss) / 1024.0;
}

void per_zone(benchmark::State& state) {
  state.counters["per_zone"] = benchmark::Counter(
      static_cast<double>(state.range(0)),
      benchmark::Counter::kIsIterationInvariantRate | benchmark::Counter::kInvert);
}

void residual(benchmark::State& state) {
  Digester tank = digester(state);
  std::vector<double> f(tank.y.size());
  for (auto _ : state) {
    tank.system->rates(tank.y, f);
    benchmark::DoNotOptimize(f.data());
  }
  per_zone(state);
  report_memory(state);
}

void jacobian(benchmark::State& state) {
  Digester tank = digester(state);
  std::vector<double> values(static_cast<std::size_t>(tank.system->pattern().n_entries()));
  for (auto _ : state) {
    tank.system->jacobian(tank.y, values);
    benchmark::DoNotOptimize(values.data());
  }
  per_zone(state);
}

/// Matrix of an implicit step of 0.1 d.
struct StepMatrix {
  explicit StepMatrix(Digester& tank) : diagonal(tank.y.size()) {
    for (std::size_t i = 0; i < diagonal.size(); ++i) {
      diagonal[i] = tank.system->differential()[i] != 0 ? 10.0 : 0.0;
    }
    values.resize(static_cast<std::size_t>(tank.system->pattern().n_entries()));
    tank.system->jacobian(tank.y, values);
  }
  std::vector<double> diagonal;
  std::vector<double> values;
};

/// With the pivots of an earlier matrix, as nearly all factorisations of a run: the first one,
/// which searches them, stays outside.
void factor(benchmark::State& state) {
  Digester tank = digester(state);
  const StepMatrix matrix(tank);
  if (!tank.solver->factor(matrix.diagonal, matrix.values)) {
    state.SkipWithError("the matrix is singular");
    return;
  }
  for (auto _ : state) {
    benchmark::DoNotOptimize(tank.solver->factor(matrix.diagonal, matrix.values));
  }
}

void solve(benchmark::State& state) {
  Digester tank = digester(state);
  const StepMatrix matrix(tank);
  if (!tank.solver->factor(matrix.diagonal, matrix.values)) {
    state.SkipWithError("the matrix is singular");
    return;
  }
  std::vector<double> b(tank.y.size(), 1.0);
  for (auto _ : state) {
    tank.solver->solve(b);
    benchmark::DoNotOptimize(b.data());
  }
}

void integrate(benchmark::State& state, Digester& tank, core::IntegratorKind kind, double days,
               double tolerance) {
  long steps = 0;
  long switches = 0;
  for (auto _ : state) {
    std::vector<double> y = tank.y;
    std::vector<double> q(tank.system->n_quadratures());
    core::IntegratorOptions options;
    options.relative_tolerance = tolerance;
    const auto integrator = core::make_integrator(kind, *tank.system, *tank.solver, options);
    core::IntegrationRequest request;
    request.until = days;
    const auto done = integrator->integrate(request, y, q);
    if (!done) {
      state.SkipWithError(done.failure().text().c_str());
      return;
    }
    steps = integrator->counts().steps;
    switches = integrator->counts().switches;
  }
  state.counters["steps"] = static_cast<double>(steps);
  state.counters["switches"] = static_cast<double>(switches);
  report_memory(state);
}

void two_hundred_days(benchmark::State& state) {
  Digester tank = digester(state);
  integrate(state, tank,
            state.range(2) == 0 ? core::IntegratorKind::multistep : core::IntegratorKind::one_step,
            200.0, 1e-6);
}

void month_of_switching(benchmark::State& state) {
  Digester tank(case_text(5, ring(5), true), network::Operation::Mode::scheduled);
  integrate(state, tank,
            state.range(0) == 0 ? core::IntegratorKind::multistep : core::IntegratorKind::one_step,
            30.0, state.range(1) == 0 ? 1e-4 : 1e-6);
}

void steady(benchmark::State& state) {
  Digester tank = digester(state);
  for (auto _ : state) {
    std::vector<double> y = tank.y;
    const auto found = core::find_steady_state(*tank.system, *tank.solver, {}, y);
    if (!found) {
      state.SkipWithError(found.failure().text().c_str());
      return;
    }
    state.counters["newton_steps"] = found.value().newton_steps;
    state.counters["loose_steps"] = static_cast<double>(found.value().steps);
  }
}

const std::vector<std::vector<std::int64_t>> kAll = {{1, 5, 20, 100, 1000}, {0, 1}};
// KLU needs most of a minute to factor a mesh of 1000 zones: that row belongs to the ring alone.
const std::vector<std::vector<std::int64_t>> kUpTo100 = {{1, 5, 20, 100}, {0, 1}};

BENCHMARK(residual)->ArgNames({"zones", "grid"})->ArgsProduct(kAll);
BENCHMARK(jacobian)->ArgNames({"zones", "grid"})->ArgsProduct(kAll);
BENCHMARK(factor)
    ->ArgNames({"zones", "grid"})
    ->ArgsProduct(kUpTo100)
    ->Args({1000, 0})
    ->Unit(benchmark::kMicrosecond);
BENCHMARK(solve)
    ->ArgNames({"zones", "grid"})
    ->ArgsProduct(kUpTo100)
    ->Args({1000, 0})
    ->Unit(benchmark::kMicrosecond);
BENCHMARK(steady)
    ->ArgNames({"zones", "grid"})
    ->ArgsProduct(kUpTo100)
    ->Unit(benchmark::kMillisecond);
BENCHMARK(two_hundred_days)
    ->ArgNames({"zones", "grid", "one_step"})
    ->ArgsProduct({{1, 5, 20, 100}, {0}, {0, 1}})
    ->Args({20, 1, 0})
    ->Args({100, 1, 0})
    ->Unit(benchmark::kMillisecond);
BENCHMARK(month_of_switching)
    ->ArgNames({"one_step", "tight"})
    ->ArgsProduct({{0, 1}, {0, 1}})
    ->Unit(benchmark::kMillisecond);

}  // namespace
}  // namespace stillzone
