#include "network/flow_balance.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "core/require.hpp"
#include "network/flow_checks.hpp"
#include "network/flow_equations.hpp"
#include "network/flow_solution.hpp"
#include "network/flow_system.hpp"

namespace stillzone::network {

namespace {

/// Work allowed for looking at the states of schedules and records, in terms of the equations.
constexpr std::size_t kMostTermsVisited = 20'000'000;
constexpr std::size_t kMostStates = 4096;
constexpr std::size_t kMostSwitches = 100'000;

/// First switch of any schedule or feed record after t.
std::optional<double> next_switch(const Case& the_case, double t) {
  std::optional<double> next;
  const auto consider = [&](const core::Timeline& timeline) {
    const auto time = timeline.next_switch(t);
    if (time && (!next || *time < *next)) next = time;
  };
  for (const Schedule& schedule : the_case.schedules) consider(schedule.timeline);
  for (const Feed& feed : the_case.feeds) {
    if (feed.flow.record) consider(*feed.flow.record);
  }
  return next;
}

/// The different states that occur in the run (or, without an end, in the first switches).
/// `complete` turns false when there are more than are kept.
std::vector<SwitchState> states_occurring(const Case& the_case, std::size_t most, bool& complete) {
  std::vector<SwitchState> states;
  const double until = the_case.run.until.value();
  const bool ends = until > 0.0;
  const std::size_t most_switches = ends ? kMostSwitches : 5000;
  std::optional<double> time = 0.0;
  for (std::size_t n = 0; time && (!ends || *time <= until); ++n) {
    if (n == most_switches) {
      complete = !ends;
      break;
    }
    SwitchState state = state_at(the_case, *time);
    const bool seen =
        std::ranges::any_of(states, [&](const SwitchState& old) { return old == state; });
    if (!seen) {
      if (states.size() == most) {
        complete = false;
        break;
      }
      states.push_back(std::move(state));
    }
    time = next_switch(the_case, *time);
  }
  return states;
}

std::string when_text(const Case& the_case, const SwitchState& state) {
  std::string text;
  if (the_case.schedules.size() <= 3) {
    for (std::size_t s = 0; s < the_case.schedules.size(); ++s) {
      text += fmt::format("{}\"{}\" is {}", text.empty() ? " while " : " and ",
                          the_case.schedules[s].name, state.factors[s] < 1.0 ? "off" : "on");
    }
  }
  const bool records =
      std::ranges::any_of(the_case.feeds, [](const Feed& feed) { return bool(feed.flow.record); });
  if (text.empty() || records) text += fmt::format(" at {:.6g} d", state.time);
  return text;
}

}  // namespace

struct FlowBalance::Impl : FlowSolution {
  using FlowSolution::FlowSolution;
};

namespace {

/// Warns when the drift had more than one route: exchanges on rings that carry some.
void warn_of_divided_drift(const Case& the_case, const FlowEquations& equations,
                           std::span<const double> x, std::vector<std::string>& warnings) {
  std::vector<std::size_t> ring = equations.drifting;
  double scale = 0.0;
  for (std::size_t f = 0; f < equations.n_feeds; ++f) scale += x[equations.feed_rate(f)];
  std::erase_if(ring, [&](std::size_t i) {
    return !equations.on_ring[i] || std::abs(x[equations.drift(i)]) <= 1e-9 * scale;
  });
  if (ring.empty()) return;
  const Flow& first = the_case.flows[ring.front()];
  warnings.push_back(fmt::format(
      "the net flow through {} exchanges, such as \"{}\" and \"{}\" ({}), has more than one way to "
      "go; it was divided in proportion to the exchanges. Give it as a one-way flow where you know "
      "it",
      ring.size(), the_case.name_of(first.from), the_case.name_of(first.to), first.pointer));
}

bool schedules_ever_on(const Case& the_case, std::span<const double> means,
                       const core::JsonDocument& document, core::FaultList& faults) {
  bool all = true;
  for (const Feed& feed : the_case.feeds) {
    if (!feed.schedule || means[feed.schedule->value()] > 0.0) continue;
    const std::string pointer =
        pointer_of(the_case,
                   {Place::Kind::feed, static_cast<std::size_t>(&feed - the_case.feeds.data())}) +
        "/schedule";
    faults.add({.file = document.name(),
                .pointer = pointer,
                .line = document.line_of(pointer),
                .found = fmt::format("schedule \"{}\" is never on",
                                     the_case.schedules[feed.schedule->value()].name),
                .allowed = "a feed's flow is its time mean, so its schedule must be on at times",
                .way_out = "Change the schedule or take it off the feed."});
    all = false;
  }
  return all;
}

}  // namespace

std::optional<FlowBalance> FlowBalance::solve(const Case& the_case,
                                              const core::JsonDocument& document,
                                              core::FaultList& faults) {
  FlowChecks checks(the_case, document, faults);
  std::vector<bool> carries = carrying_by_itself(the_case);
  checks.graph(carries);
  auto impl = std::make_shared<const Impl>(the_case);
  const FlowEquations& equations = impl->equations;
  checks.shares(equations);
  if (!schedules_ever_on(the_case, impl->means, document, faults)) return std::nullopt;
  checks.open_flows(equations, impl->system);

  const bool switched = !the_case.schedules.empty();
  const auto mean = impl->variables(the_case, impl->mean_state(the_case, 0.0));
  const std::string on_average(switched ? kOnAverage : "");
  checks.contradictions(equations, impl->system, mean, on_average);
  if (checks.found_any()) return std::nullopt;
  checks.negatives(equations, mean, on_average);

  const std::size_t n_terms = impl->system.n_terms() + equations.n_flows + 1;
  const std::size_t most = std::clamp<std::size_t>(kMostTermsVisited / n_terms, 256, kMostStates);
  bool complete = true;
  const auto states = states_occurring(the_case, most, complete);
  std::vector<double> largest(mean.begin(),
                              mean.begin() + static_cast<std::ptrdiff_t>(equations.n_flows));
  for (const SwitchState& state : states) {
    const auto x = impl->variables(the_case, state);
    const std::string when = when_text(the_case, state);
    if (!checks.found_any()) checks.contradictions(equations, impl->system, x, when);
    checks.negatives(equations, x, when);
    for (std::size_t i = 0; i < equations.n_flows; ++i) largest[i] = std::max(largest[i], x[i]);
  }
  if (checks.found_any()) return std::nullopt;
  for (std::size_t i = 0; i < equations.n_flows; ++i) {
    // A share of something is something, be it lost in rounding.
    carries[i] = largest[i] > 0.0 || (equations.by_share[i] && equations.share[i] > 0.0);
  }
  checks.graph(carries);
  if (checks.found_any()) return std::nullopt;

  FlowBalance balance;
  for (std::size_t i = 0; i < the_case.flows.size(); ++i) {
    const Flow& flow = the_case.flows[i];
    balance.streams_.push_back({flow.from, flow.to, i});
    if (flow.exchange) balance.streams_.push_back({flow.to, flow.from, i});
    if (carries[i]) continue;
    balance.warnings_.push_back(
        fmt::format("the flow {} \"{}\" {} \"{}\" ({}) is 0 at all times",
                    flow.exchange ? "between" : "from", the_case.name_of(flow.from),
                    flow.exchange ? "and" : "to", the_case.name_of(flow.to), flow.pointer));
  }
  warn_of_divided_drift(the_case, equations, mean, balance.warnings_);
  if (!complete) {
    balance.warnings_.push_back(
        fmt::format("schedules and records combine in more ways than were checked for negative "
                    "flows ({} were)",
                    states.size()));
  }
  balance.impl_ = std::move(impl);
  return balance;
}

std::vector<double> FlowBalance::rates_at(const Case& the_case, double t) const {
  return stream_rates(streams_, the_case, impl_->equations,
                      impl_->variables(the_case, state_at(the_case, t)));
}

std::vector<double> FlowBalance::mean_rates(const Case& the_case, double t) const {
  return stream_rates(streams_, the_case, impl_->equations,
                      impl_->variables(the_case, impl_->mean_state(the_case, t)));
}

double FlowBalance::closure_error(const Case& the_case, std::span<const double> rates) const {
  SZ_REQUIRE(rates.size() == streams_.size(), "{} rates for {} streams", rates.size(),
             streams_.size());
  std::vector<double> net(the_case.zones.size(), 0.0);
  double fed = 0.0;
  double largest = 0.0;
  for (std::size_t s = 0; s < streams_.size(); ++s) {
    const Stream& stream = streams_[s];
    if (stream.from.kind == Place::Kind::zone) net[stream.from.index] -= rates[s];
    if (stream.from.kind == Place::Kind::feed) fed += rates[s];
    if (stream.to.kind == Place::Kind::zone) net[stream.to.index] += rates[s];
    largest = std::max(largest, rates[s]);
  }
  double worst = 0.0;
  for (const double difference : net) worst = std::max(worst, std::abs(difference));
  const double scale = fed > 0.0 ? fed : largest;
  return scale > 0.0 ? worst / scale : 0.0;
}

}  // namespace stillzone::network
