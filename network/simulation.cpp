#include "network/simulation.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <chrono>
#include <utility>

#include "core/dae/integrator.hpp"
#include "core/dae/linear_solver.hpp"
#include "core/dae/steady_state.hpp"
#include "network/digester_system.hpp"
#include "network/periodic_state.hpp"
#include "network/result_assembly.hpp"
#include "network/series_recorder.hpp"
#include "network/snapshot.hpp"
#include "network/start_state.hpp"

namespace stillzone::network {

namespace {

constexpr double kPeriodicAgreement = 1e-6;
constexpr int kMostCycles = 400;
constexpr double kRecordsPerCycle = 200.0;
/// A balance of rates in a steady state closes to this (Newton's last step is smaller).
constexpr double kSteadyTolerance = 1e-9;

using Clock = std::chrono::steady_clock;
using Stored = std::array<double, kConserved.size()>;

Stored stored_in(const DigesterSystem& system, std::span<const double> y) {
  Stored stored{};
  for (const Conserved what : kConserved) {
    stored[static_cast<std::size_t>(what)] = system.ledger().stored(what, y);
  }
  return stored;
}

core::IntegratorKind integrator_kind(const std::string& word) {
  if (word == "multistep") return core::IntegratorKind::multistep;
  if (word == "one-step") return core::IntegratorKind::one_step;
  return core::IntegratorKind::automatic;
}

/// A steady state of the case under its mean conditions, and what it took.
struct SteadyState {
  std::vector<double> y;
  core::SteadyReport report;
  std::string groups;  ///< which microbial groups live
};

core::Result<SteadyState> steady_state(const Case& the_case, DigesterSystem& mean,
                                       core::LinearSolver& solver, const RunHooks& hooks) {
  mean.enter(0.0);
  auto start = start_state(the_case, mean);
  if (!start) return start.failure();
  SteadyState found{.y = std::move(start).value(), .report = {}, .groups = {}};
  core::SteadyOptions options;
  if (hooks.progress) options.progress = [&](double t) { hooks.progress(0.0, t); };
  auto report = core::find_steady_state(mean, solver, options, found.y);
  if (!report) return report.failure();
  found.report = std::move(report).value();
  found.groups = living_groups(the_case, mean, found.y, mean.operation().at(0.0));
  return found;
}

std::string with_groups(std::string text, const std::string& groups) {
  return groups.empty() ? text : text + "; " + groups;
}

/// Time means behind the gas pipes from the quadratures of a stretch of `days`.
void read_gas_meters(std::span<const double> quadratures, double days, RunResult& result) {
  const double* read = quadratures.data() + Ledger::n_entries();
  for (HeadspaceResult& headspace : result.headspaces) {
    headspace.mean_gas_flow = read[GasMeter::kWet] / days;
    headspace.mean_gas_flow_normal_dry = read[GasMeter::kNormalDry] / days;
    headspace.mean_methane_flow_normal = read[GasMeter::kMethane] / days;
    read += GasMeter::kReadings;
  }
}

core::IntegratorCounts counts_of(const core::SteadyReport& report,
                                 const core::LinearSolver& solver) {
  core::IntegratorCounts counts;
  counts.method = "steady-state search (one-step integration, then Newton)";
  counts.reason = report.how;
  counts.linear_solver = solver.name();
  counts.steps = report.steps;
  counts.rate_calls = report.rate_calls;
  counts.jacobian_calls = report.jacobian_calls;
  counts.factorisations = report.factorisations;
  counts.solves = static_cast<long>(solver.n_solves);
  return counts;
}

core::Result<RunResult> run_steady(const Case& the_case, const FlowBalance& balance,
                                   const RunHooks& hooks) {
  DigesterSystem system(the_case, balance, {.mode = Operation::Mode::mean});
  const auto solver = core::make_klu_solver(system.pattern());
  auto found = steady_state(the_case, system, *solver, hooks);
  if (!found) return found.failure();
  const std::vector<double>& y = found.value().y;

  RunResult result;
  result.kind = "steady";
  result.unknowns = system.n_unknowns();
  result.solver = counts_of(found.value().report, *solver);
  result.solution_note = with_groups(found.value().report.how, found.value().groups);
  const OperatingPoint point = system.operation().at(0.0);
  SnapshotMaker snapshots(the_case, system);
  assemble_places(the_case, system, snapshots, y, point, result);
  std::vector<double> g(system.n_quadratures());
  system.quadrature_rates(y, g);
  result.balances = system.ledger().balances(g, Stored{}, Stored{});
  read_gas_meters(g, 1.0, result);
  if (!the_case.schedules.empty()) {
    result.warnings.emplace_back(
        "a steady state is that of the mean conditions: every schedule is at its mean (kind "
        "\"periodic\" or \"dynamic\" follows the schedules)");
  }
  assemble_warnings(the_case, system, y, kSteadyTolerance, true, result);
  return result;
}

/// Where a dynamic or periodic run starts.
struct Start {
  std::vector<double> y;
  std::string note;
};

core::Result<Start> start_of_run(const Case& the_case, const FlowBalance& balance,
                                 DigesterSystem& system, const RunHooks& hooks) {
  if (the_case.run.start != RunSettings::Start::steady) {
    auto state = start_state(the_case, system);
    if (!state) return state.failure();
    return Start{std::move(state).value(), ""};
  }
  DigesterSystem mean(the_case, balance, {.mode = Operation::Mode::mean});
  const auto solver = core::make_klu_solver(mean.pattern());
  auto found = steady_state(the_case, mean, *solver, hooks);
  if (!found) {
    core::Failure failure = found.failure();
    failure.reason = "the steady state to start from was not found: " + failure.reason;
    return failure;
  }
  return Start{std::move(found.value().y),
               with_groups("started at the steady state of the mean conditions (" +
                               found.value().report.how + ")",
                           found.value().groups)};
}

/// Integrates from `from` to `until` with history and books, and fills the result with them.
core::Result<core::Done> recorded_run(const Case& the_case, DigesterSystem& system,
                                      core::Integrator& integrator, double from, double until,
                                      double record_every,
                                      const std::function<void(double)>& progress,
                                      std::span<double> y, RunResult& result) {
  SnapshotMaker snapshots(the_case, system);
  SeriesRecorder recorder(the_case, system, snapshots);
  const std::vector<double> times = record_times(from, until, record_every);
  for (const Schedule& schedule : the_case.schedules) {
    const double period = schedule.timeline.period().value_or(0.0);
    if (period <= 0.0 || period >= 4.0 * record_every) continue;
    result.warnings.push_back(fmt::format(
        "schedule \"{}\" repeats every {:.3g} d and the history is recorded every {:.3g} "
        "d: it shows samples of the switching, not its means; record oftener, or take "
        "the means of the summary",
        schedule.name, period, record_every));
  }
  const Stored before = stored_in(system, y);
  std::vector<double> q(system.n_quadratures(), 0.0);
  core::IntegrationRequest request;
  request.from = from;
  request.until = until;
  request.record_at = times;
  request.record = [&](double t, std::span<const double> state, std::span<const double>) {
    recorder.record(t, state);
  };
  request.progress = progress;
  if (auto done = integrator.integrate(request, y, q); !done) return done;
  result.until = until;
  result.series = recorder.take();
  result.balances = system.ledger().balances(q, before, stored_in(system, y));
  OperatingPoint mean = system.operation().at(until);
  mean.rates = system.operation().mean_rates(from, until);
  assemble_places(the_case, system, snapshots, y, mean, result);
  read_gas_meters(q, until - from, result);
  result.solver = integrator.counts();
  result.unknowns = system.n_unknowns();
  assemble_warnings(the_case, system, y, the_case.run.tolerance, false, result);
  return core::Done{};
}

core::Result<RunResult> run_dynamic(const Case& the_case, const FlowBalance& balance,
                                    const RunHooks& hooks) {
  DigesterSystem system(the_case, balance, {});
  auto start = start_of_run(the_case, balance, system, hooks);
  if (!start) return start.failure();
  const auto solver = core::make_klu_solver(system.pattern());
  core::IntegratorOptions options;
  options.relative_tolerance = the_case.run.tolerance;
  const auto integrator =
      core::make_integrator(integrator_kind(the_case.run.integrator), system, *solver, options);
  const double until = the_case.run.until.value();
  std::function<void(double)> progress;
  if (hooks.progress) progress = [&](double t) { hooks.progress(t / until, t); };
  RunResult result;
  result.kind = "dynamic";
  result.solution_note = std::move(start.value().note);
  auto done = recorded_run(the_case, system, *integrator, 0.0, until,
                           the_case.run.record_every.value(), progress, start.value().y, result);
  if (!done) return done.failure();
  return result;
}

core::Result<RunResult> run_periodic(const Case& the_case, const FlowBalance& balance,
                                     const RunHooks& hooks) {
  auto period = common_period(the_case);
  if (!period) return period.failure();
  DigesterSystem system(the_case, balance, {});
  auto start = start_of_run(the_case, balance, system, hooks);
  if (!start) return start.failure();
  const auto solver = core::make_klu_solver(system.pattern());
  core::IntegratorOptions options;
  options.relative_tolerance = the_case.run.tolerance;
  const auto integrator =
      core::make_integrator(integrator_kind(the_case.run.integrator), system, *solver, options);
  std::function<void(double)> progress;
  if (hooks.progress) progress = [&](double t) { hooks.progress(0.0, t); };
  std::vector<double>& y = start.value().y;
  auto found = find_periodic_state(system, *integrator, period.value(), kPeriodicAgreement,
                                   kMostCycles, progress, y);
  if (!found) return found.failure();
  const PeriodicReport& report = found.value();
  RunResult result;
  result.kind = "periodic";
  result.solution_note = fmt::format(
      "periodic after {} cycles of {:g} d: the state changes by {:.1e} of itself per cycle <= {:g}",
      report.cycles, report.period, report.residual, kPeriodicAgreement);
  auto done =
      recorded_run(the_case, system, *integrator, report.time, (report.cycles + 1) * report.period,
                   report.period / kRecordsPerCycle, progress, y, result);
  if (!done) return done.failure();
  return result;
}

}  // namespace

core::Result<RunResult> run_case(const Case& the_case, const FlowBalance& balance,
                                 const RunHooks& hooks) {
  const auto begin = Clock::now();
  auto run = [&] {
    switch (the_case.run.kind) {
      case RunSettings::Kind::dynamic:
        return run_dynamic(the_case, balance, hooks);
      case RunSettings::Kind::periodic:
        return run_periodic(the_case, balance, hooks);
      case RunSettings::Kind::steady:
        break;
    }
    return run_steady(the_case, balance, hooks);
  };
  auto result = run();
  if (!result) return result;
  RunResult& found = result.value();
  found.seconds = std::chrono::duration<double>(Clock::now() - begin).count();
  std::vector<std::string> warnings = the_case.warnings;
  warnings.insert(warnings.end(), balance.warnings().begin(), balance.warnings().end());
  found.warnings.insert(found.warnings.begin(), warnings.begin(), warnings.end());
  return result;
}

}  // namespace stillzone::network
