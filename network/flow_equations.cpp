#include "network/flow_equations.hpp"

#include <algorithm>

namespace stillzone::network {

namespace {

constexpr double kShareTolerance = 1e-6;

FlowSystem::Row plus_row(const std::vector<std::size_t>& flows, double factor) {
  FlowSystem::Row row;
  for (const std::size_t flow : flows) row.push_back({flow, factor});
  return row;
}

/// A zone in which a flow comes in and goes out on the same line cannot be: ends differ. So each
/// flow stands once in a zone's row.
void append(FlowSystem::Row& row, const FlowSystem::Row& more) {
  row.insert(row.end(), more.begin(), more.end());
}

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

FlowEquations::FlowEquations(const Case& the_case)
    : n_flows(the_case.flows.size()),
      n_feeds(the_case.feeds.size()),
      out_of_feed(the_case.feeds.size()),
      out_of_zone(the_case.zones.size()),
      into_zone(the_case.zones.size()) {
  known.assign(n_flows + n_feeds + the_case.zones.size(), false);
  for (std::size_t i = 0; i < n_flows; ++i) {
    const Flow& flow = the_case.flows[i];
    known[i] = flow.given.has_value();
    if (flow.exchange) continue;
    auto& leaving = flow.from.kind == Place::Kind::feed ? out_of_feed : out_of_zone;
    leaving[flow.from.index].push_back(i);
    if (flow.to.kind == Place::Kind::zone) into_zone[flow.to.index].push_back(i);
  }
  // Shares that take everything are scaled to add up to exactly 1, so that 0.333 333 3 three times
  // closes the balance to the last digit.
  const auto add_shares = [&](const std::vector<std::size_t>& leaving, std::size_t total) {
    const ShareSum sum = share_sum(the_case, leaving);
    const bool all = !sum.rest_possible || sum.sum > 1.0 - kShareTolerance;
    for (const std::size_t i : leaving) {
      if (!the_case.flows[i].share) continue;
      double share = the_case.flows[i].share->value();
      if (all && sum.sum > 0.0) share /= sum.sum;
      rows.push_back({{i, 1.0}, {total, -share}});
      meanings.push_back({Meaning::Kind::share, i});
    }
    return sum.n_shares > 0;
  };
  for (std::size_t f = 0; f < n_feeds; ++f) {
    known[feed_rate(f)] = true;
    FlowSystem::Row row = plus_row(out_of_feed[f], 1.0);
    row.push_back({feed_rate(f), -1.0});
    rows.push_back(std::move(row));
    meanings.push_back({Meaning::Kind::feed, f});
    add_shares(out_of_feed[f], feed_rate(f));
  }
  for (std::size_t z = 0; z < the_case.zones.size(); ++z) {
    FlowSystem::Row in = plus_row(into_zone[z], 1.0);
    FlowSystem::Row out = plus_row(out_of_zone[z], -1.0);
    if (!add_shares(out_of_zone[z], throughflow(z))) {
      known[throughflow(z)] = true;
      append(in, out);
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
