#include "network/flow_equations.hpp"

#include <algorithm>
#include <numeric>

#include "network/zone_graph.hpp"

namespace stillzone::network {

namespace {

constexpr double kShareTolerance = 1e-6;

}  // namespace

bool ShareSum::adds_up() const {
  if (n_shares == 0) return true;
  if (sum > 1.0 + kShareTolerance) return false;
  return rest_possible || sum >= 1.0 - kShareTolerance;
}

ShareSum share_sum(const Case& the_case, const std::vector<std::size_t>& leaving) {
  ShareSum total;
  for (const std::size_t flow : leaving) {
    if (the_case.flows[flow].share) {
      total.sum += the_case.flows[flow].share->value();
      ++total.n_shares;
    } else {
      total.rest_possible = true;
    }
  }
  return total;
}

std::vector<bool> carrying_by_itself(const Case& the_case) {
  std::vector<bool> carries;
  for (const Flow& flow : the_case.flows) {
    const bool zero_flow = flow.given && !(flow.given->value() > 0.0);
    const bool zero_share = flow.share && !(flow.share->value() > 0.0);
    carries.push_back(!zero_flow && !zero_share);
  }
  return carries;
}

std::size_t PlaceNumbering::of(Place place) const {
  switch (place.kind) {
    case Place::Kind::zone:
      return place.index;
    case Place::Kind::feed:
      return n_zones + place.index;
    case Place::Kind::outlet:
      return n_zones + n_feeds + place.index;
  }
  return 0;
}

std::vector<std::size_t> PlaceNumbering::feeds() const {
  std::vector<std::size_t> numbers(n_feeds);
  std::iota(numbers.begin(), numbers.end(), n_zones);
  return numbers;
}

std::vector<std::size_t> PlaceNumbering::outlets() const {
  std::vector<std::size_t> numbers(n_outlets);
  std::iota(numbers.begin(), numbers.end(), n_zones + n_feeds);
  return numbers;
}

FlowEquations::FlowEquations(const Case& the_case)
    : n_flows(the_case.flows.size()),
      n_feeds(the_case.feeds.size()),
      out_of_feed(the_case.feeds.size()),
      out_of_zone(the_case.zones.size()),
      into_zone(the_case.zones.size()) {
  known.assign(potential(the_case.zones.size()), false);
  collect_flows(the_case);
  scale_shares(the_case);
  find_drifting(the_case);
  find_rings(the_case);
  for (std::size_t f = 0; f < n_feeds; ++f) {
    known[feed_rate(f)] = true;
    FlowSystem::Row row = {{feed_rate(f), -1.0}};
    for (const std::size_t i : out_of_feed[f]) add_flow(row, the_case, i, 1.0);
    rows.push_back(std::move(row));
    meanings.push_back({Meaning::Kind::feed, f});
    add_share_rows(the_case, out_of_feed[f], feed_rate(f));
  }
  add_zone_rows(the_case);
  add_drift_rows(the_case);
}

std::optional<std::size_t> FlowEquations::flow_of(std::size_t variable) const {
  if (variable < n_flows) return variable;
  if (variable >= drift(0) && variable < drift(n_flows)) return variable - drift(0);
  return std::nullopt;
}

void FlowEquations::collect_flows(const Case& the_case) {
  for (std::size_t i = 0; i < n_flows; ++i) {
    const Flow& flow = the_case.flows[i];
    known[i] = flow.given.has_value();
    if (flow.exchange) continue;
    auto& leaving = flow.from.kind == Place::Kind::feed ? out_of_feed : out_of_zone;
    leaving[flow.from.index].push_back(i);
    if (flow.to.kind == Place::Kind::zone) into_zone[flow.to.index].push_back(i);
  }
}

void FlowEquations::find_drifting(const Case& the_case) {
  const PlaceNumbering number(the_case);
  const std::vector<bool> carries = carrying_by_itself(the_case);
  std::vector<Link> one_way;
  for (std::size_t i = 0; i < n_flows; ++i) {
    const Flow& flow = the_case.flows[i];
    if (!flow.exchange && carries[i]) one_way.push_back({number.of(flow.from), number.of(flow.to)});
  }
  const ZoneGraph graph(number.n_places(), one_way);
  const auto fed = graph.reached_from(number.feeds());
  const auto drained = graph.leading_to(number.outlets());
  const auto settled = [&](Place zone) { return fed[zone.index] && drained[zone.index]; };
  for (std::size_t i = 0; i < n_flows; ++i) {
    const Flow& flow = the_case.flows[i];
    if (!flow.exchange || !carries[i]) continue;
    if (!settled(flow.from) || !settled(flow.to)) drifting.push_back(i);
  }
}

/// Cuts branches off the graph of drifting exchanges, from their ends, until rings are left.
void FlowEquations::find_rings(const Case& the_case) {
  on_ring.assign(n_flows, false);
  std::vector<std::vector<std::size_t>> at_zone(the_case.zones.size());
  std::vector<std::size_t> n_left(the_case.zones.size(), 0);
  for (const std::size_t i : drifting) {
    on_ring[i] = true;
    for (const std::size_t zone : {the_case.flows[i].from.index, the_case.flows[i].to.index}) {
      at_zone[zone].push_back(i);
      ++n_left[zone];
    }
  }
  std::vector<std::size_t> ends;
  for (std::size_t z = 0; z < n_left.size(); ++z) {
    if (n_left[z] == 1) ends.push_back(z);
  }
  while (!ends.empty()) {
    const std::size_t zone = ends.back();
    ends.pop_back();
    for (const std::size_t i : at_zone[zone]) {
      if (!on_ring[i]) continue;
      on_ring[i] = false;
      const Flow& flow = the_case.flows[i];
      const std::size_t other = flow.from.index == zone ? flow.to.index : flow.from.index;
      if (--n_left[other] == 1) ends.push_back(other);
    }
  }
}

/// Shares that take everything are scaled to add up to exactly 1, so that 0.333 333 3 three times
/// closes the balance to the last digit.
void FlowEquations::scale_shares(const Case& the_case) {
  share.assign(n_flows, 0.0);
  by_share.assign(n_flows, false);
  const auto scale = [&](const std::vector<std::size_t>& leaving) {
    const ShareSum sum = share_sum(the_case, leaving);
    const bool all = !sum.rest_possible || sum.sum > 1.0 - kShareTolerance;
    for (const std::size_t i : leaving) {
      if (!the_case.flows[i].share) continue;
      share[i] = the_case.flows[i].share->value();
      if (all && sum.sum > 0.0) share[i] /= sum.sum;
      by_share[i] = !the_case.flows[i].given;
    }
    // One flow that takes the rest of shares alone has a share too.
    const auto is_rest = [&](std::size_t i) { return !the_case.flows[i].share; };
    if (sum.n_shares == 0 || std::ranges::count_if(leaving, is_rest) != 1) return;
    const std::size_t rest = *std::ranges::find_if(leaving, is_rest);
    if (the_case.flows[rest].given) return;
    share[rest] = all ? 0.0 : 1.0 - sum.sum;
    by_share[rest] = true;
  };
  for (const auto& leaving : out_of_feed) scale(leaving);
  for (const auto& leaving : out_of_zone) scale(leaving);
}

/// A flow that is only a share stands in the rows as that share of its total: the equations stay
/// small, and its own row gives it afterwards.
void FlowEquations::add_flow(FlowSystem::Row& row, const Case& the_case, std::size_t i,
                             double factor) const {
  const Flow& flow = the_case.flows[i];
  if (!by_share[i]) {
    row.push_back({i, factor});
  } else if (flow.from.kind == Place::Kind::feed) {
    row.push_back({feed_rate(flow.from.index), factor * share[i]});
  } else {
    row.push_back({throughflow(flow.from.index), factor * share[i]});
  }
}

/// On a ring the potentials stand for the drift; elsewhere the drift itself, found exactly.
void FlowEquations::add_drift(FlowSystem::Row& row, const Case& the_case, std::size_t i,
                              double factor) const {
  if (!on_ring[i]) {
    row.push_back({drift(i), factor});
    return;
  }
  const Flow& flow = the_case.flows[i];
  row.push_back({potential(flow.from.index), factor * flow.given->value()});
  row.push_back({potential(flow.to.index), -factor * flow.given->value()});
}

bool FlowEquations::add_share_rows(const Case& the_case, const std::vector<std::size_t>& leaving,
                                   std::size_t total) {
  bool any = false;
  for (const std::size_t i : leaving) {
    any = any || the_case.flows[i].share.has_value();
    if (!by_share[i] && !the_case.flows[i].share) continue;
    rows.push_back({{i, 1.0}, {total, -share[i]}});
    meanings.push_back({Meaning::Kind::share, i});
  }
  return any;
}

void FlowEquations::add_zone_rows(const Case& the_case) {
  std::vector<FlowSystem::Row> entering(the_case.zones.size());
  for (std::size_t z = 0; z < the_case.zones.size(); ++z) {
    for (const std::size_t i : into_zone[z]) add_flow(entering[z], the_case, i, 1.0);
  }
  for (const std::size_t i : drifting) {
    add_drift(entering[the_case.flows[i].from.index], the_case, i, -1.0);
    add_drift(entering[the_case.flows[i].to.index], the_case, i, 1.0);
  }
  for (std::size_t z = 0; z < the_case.zones.size(); ++z) {
    FlowSystem::Row& in = entering[z];
    FlowSystem::Row out;
    for (const std::size_t i : out_of_zone[z]) add_flow(out, the_case, i, -1.0);
    if (!add_share_rows(the_case, out_of_zone[z], throughflow(z))) {
      known[throughflow(z)] = true;
      in.insert(in.end(), out.begin(), out.end());
      rows.push_back(std::move(in));
      meanings.push_back({Meaning::Kind::zone_in_out, z});
      continue;
    }
    in.push_back({throughflow(z), -1.0});
    out.push_back({throughflow(z), 1.0});
    rows.push_back(std::move(in));
    meanings.push_back({Meaning::Kind::zone_in, z});
    rows.push_back(std::move(out));
    meanings.push_back({Meaning::Kind::zone_out, z});
  }
}

void FlowEquations::add_drift_rows(const Case& the_case) {
  const std::size_t n_zones = the_case.zones.size();
  for (std::size_t i = 0; i < n_flows; ++i) known[drift(i)] = true;
  std::vector<Link> links;
  std::vector<bool> joined(n_zones, false);
  for (const std::size_t i : drifting) {
    const Flow& flow = the_case.flows[i];
    known[drift(i)] = false;
    links.push_back({flow.from.index, flow.to.index});
    joined[flow.from.index] = true;
    joined[flow.to.index] = true;
    rows.push_back({{drift(i), 1.0 / flow.given->value()},
                    {potential(flow.from.index), -1.0},
                    {potential(flow.to.index), 1.0}});
    meanings.push_back({Meaning::Kind::drift, i});
  }
  // Potentials count from the first zone of each group of joined zones.
  const auto parts = ZoneGraph(n_zones, links).parts();
  std::vector<bool> part_seen(n_zones, false);
  for (std::size_t z = 0; z < n_zones; ++z) {
    known[potential(z)] = !joined[z] || !part_seen[parts[z]];
    part_seen[parts[z]] = true;
  }
}

SwitchState state_at(const Case& the_case, double t) {
  SwitchState state;
  state.time = t;
  for (const Schedule& schedule : the_case.schedules) {
    state.factors.push_back(schedule.timeline.value_from(t));
  }
  for (const Feed& feed : the_case.feeds) {
    state.feeds.push_back(feed.flow.record ? feed.flow.record->value_from(t) : feed.flow.value);
  }
  return state;
}

std::vector<double> schedule_means(const Case& the_case) {
  const double until = the_case.run.until.value() > 0.0 ? the_case.run.until.value() : 365.0;
  std::vector<double> means;
  for (const Schedule& schedule : the_case.schedules) {
    means.push_back(schedule.timeline.mean(0.0, until));
  }
  return means;
}

}  // namespace stillzone::network
