#include "network/washout/load_flows.hpp"

#include <algorithm>
#include <cmath>

namespace stillzone::network {

namespace {

constexpr double kBalanced = 1e-9;

}  // namespace

LoadFlows::LoadFlows(const Case& the_case, const FlowBalance& balance, bool zones_too)
    : case_(&the_case), balance_(&balance) {
  today_ = Operation(the_case, balance, Operation::Mode::mean).at(0.0);
  const FlowSolution solution(the_case);
  fixed_ = solution.known_variables(the_case, solution.mean_state(the_case, 0.0));
  growing_.assign(fixed_.size(), 0.0);
  bool some_stay = false;
  for (std::size_t i = 0; i < the_case.flows.size(); ++i) {
    const Flow& flow = the_case.flows[i];
    const bool carries_feed = !flow.exchange && (zones_too || flow.from.kind == Place::Kind::feed ||
                                                 flow.to.kind == Place::Kind::outlet);
    if (flow.given && !carries_feed) some_stay = true;
    if (flow.given && carries_feed) std::swap(fixed_[i], growing_[i]);
  }
  for (std::size_t f = 0; f < the_case.feeds.size(); ++f) {
    const std::size_t at = solution.equations.feed_rate(f);
    std::swap(fixed_[at], growing_[at]);
  }
  solution.system.substitute(fixed_);
  solution.system.substitute(growing_);
  for (const Stream& stream : balance.streams()) {
    const Flow& flow = the_case.flows[stream.flow];
    drift_.push_back(flow.exchange ? std::optional(solution.equations.drift(stream.flow))
                                   : std::nullopt);
    direction_.push_back(stream.from == flow.from ? 1.0 : -1.0);
  }
  rule_ =
      "load 1 is today: the flow of every feed is multiplied by the load, its concentrations "
      "are kept, so the retention time falls as 1/load; flows found by continuity or share "
      "follow";
  if (some_stay) {
    rule_ += zones_too ? "; exchanges stay as given, every given one-way flow is multiplied too"
                       : "; exchanges and flows given between zones (mixing) stay as they are";
  }
}

std::vector<double> LoadFlows::stream_values(double load, bool derivative) const {
  const auto streams = balance_->streams();
  std::vector<double> values(streams.size());
  double largest = 0.0;
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const std::size_t v = streams[s].flow;
    values[s] = derivative ? growing_[v] : fixed_[v] + load * growing_[v];
    if (drift_[s]) {
      const std::size_t d = *drift_[s];
      const double net = direction_[s] * (fixed_[d] + load * growing_[d]);
      const double net_by_load = direction_[s] * growing_[d];
      if (net > 0.0) values[s] += derivative ? net_by_load : net;
    }
    largest = std::max(largest, std::abs(values[s]));
  }
  for (double& value : values) {
    if (std::abs(value) <= 1e-13 * largest) value = 0.0;  // what rounding leaves of "the rest"
  }
  return values;
}

OperatingPoint LoadFlows::at(double load) const {
  OperatingPoint point = today_;
  point.rates = stream_values(load, false);
  return point;
}

OperatingPoint LoadFlows::derivative(double load) const {
  OperatingPoint point = today_;
  point.rates = stream_values(load, true);
  return point;
}

bool LoadFlows::possible(double load) const {
  const auto rates = stream_values(load, false);
  return std::ranges::all_of(rates, [](double rate) { return rate >= 0.0; });
}

/// Water in = water out in every zone.
bool LoadFlows::balances(double load) const {
  const auto rates = stream_values(load, false);
  std::vector<double> net(case_->zones.size(), 0.0);
  double largest = 0.0;
  const auto streams = balance_->streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    largest = std::max(largest, std::abs(rates[s]));
    if (streams[s].from.kind == Place::Kind::zone) net[streams[s].from.index] -= rates[s];
    if (streams[s].to.kind == Place::Kind::zone) net[streams[s].to.index] += rates[s];
  }
  return std::ranges::all_of(net, [&](double v) { return std::abs(v) <= kBalanced * largest; });
}

std::optional<LoadFlows> LoadFlows::of(const Case& the_case, const FlowBalance& balance) {
  for (const bool zones_too : {false, true}) {
    LoadFlows flows(the_case, balance, zones_too);
    if (flows.balances(0.5) && flows.balances(2.0) && flows.possible(2.0)) return flows;
  }
  return std::nullopt;
}

}  // namespace stillzone::network
