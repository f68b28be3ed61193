#include "network/periodic_state.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <string>
#include <vector>

namespace stillzone::network {

namespace {

constexpr int kMostMultiples = 1000;

core::Failure no_period(std::string reason, std::string try_this) {
  return {.reason = std::move(reason), .try_this = std::move(try_this)};
}

bool divides(double period, double multiple) {
  const double ratio = multiple / period;
  return std::abs(ratio - std::round(ratio)) < 1e-9 * ratio;
}

bool has_record(const Feed& feed) {
  return feed.flow.record || feed.load.record ||
         std::ranges::any_of(feed.state, [](const Recorded& r) { return r.record.has_value(); });
}

}  // namespace

core::Result<double> common_period(const Case& the_case) {
  std::vector<bool> used(the_case.schedules.size(), false);
  for (const Flow& flow : the_case.flows) {
    if (flow.schedule) used[flow.schedule->value()] = true;
  }
  for (const Feed& feed : the_case.feeds) {
    if (feed.schedule) used[feed.schedule->value()] = true;
    if (has_record(feed)) {
      return no_period(
          fmt::format("feed \"{}\" follows a record, which does not repeat", feed.name),
          "Use run kind \"dynamic\".");
    }
  }
  std::vector<double> periods;
  for (std::size_t s = 0; s < used.size(); ++s) {
    if (!used[s]) continue;
    const Schedule& schedule = the_case.schedules[s];
    const auto period = schedule.timeline.period();
    if (!period) {
      return no_period(fmt::format("schedule \"{}\" has windows that do not repeat", schedule.name),
                       "Use run kind \"dynamic\", or leave the windows out.");
    }
    if (*period > 0.0) periods.push_back(*period);
  }
  if (periods.empty()) {
    return no_period("nothing in this case switches, so there is no period",
                     "Use run kind \"steady\".");
  }
  const double longest = std::ranges::max(periods);
  for (int k = 1; k <= kMostMultiples; ++k) {
    const double multiple = k * longest;
    if (std::ranges::all_of(periods, [&](double p) { return divides(p, multiple); })) {
      return multiple;
    }
  }
  return no_period(fmt::format("the schedules have no common period within {} times {:g} d",
                               kMostMultiples, longest),
                   "Round their periods so that one fits into the other, or use run kind "
                   "\"dynamic\".");
}

core::Result<PeriodicReport> find_periodic_state(DigesterSystem& system,
                                                 core::Integrator& integrator, double period,
                                                 double agreement, int most_cycles,
                                                 const std::function<void(double time)>& progress,
                                                 std::span<double> y) {
  PeriodicReport report;
  report.period = period;
  const auto floors = system.floors();
  std::vector<double> before(y.size());
  std::vector<double> q(system.n_quadratures());
  std::size_t worst = 0;
  while (report.cycles < most_cycles) {
    std::ranges::copy(y, before.begin());
    core::IntegrationRequest request;
    request.from = report.time;
    request.until = (report.cycles + 1) * period;
    request.progress = progress;
    if (auto done = integrator.integrate(request, y, q); !done) return done.failure();
    ++report.cycles;
    report.time = request.until;
    report.residual = 0.0;
    for (std::size_t i = 0; i < y.size(); ++i) {
      const double change = std::abs(y[i] - before[i]) / std::max(std::abs(y[i]), floors[i]);
      if (change > report.residual) {
        report.residual = change;
        worst = i;
      }
    }
    if (report.residual <= agreement) return report;
  }
  return core::Failure{
      .reason = fmt::format("not periodic after {} cycles of {:g} d: the state still changes by "
                            "{:.1e} of itself per cycle, more than {:g}",
                            report.cycles, period, report.residual, agreement),
      .time_d = report.time,
      .place = system.unknown_place(worst),
      .quantity = system.unknown_quantity(worst),
      .got_done = "",
      .try_this = "Look at its history with a dynamic run."};
}

}  // namespace stillzone::network
