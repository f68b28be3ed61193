#include "network/operation.hpp"

#include <algorithm>

#include "core/require.hpp"

namespace stillzone::network {

namespace {

/// Points kept; more (long records) are worked out again.
constexpr std::size_t kMostPoints = 2048;

double value_of(const Recorded& recorded, double t) {
  return recorded.record ? recorded.record->value_from(t) : recorded.value;
}

std::vector<double> feed_states(const Case& the_case, double t) {
  const auto& components = the_case.kinetics.components;
  std::vector<double> states;
  states.reserve(the_case.feeds.size() * components.size());
  for (const Feed& feed : the_case.feeds) {
    SZ_REQUIRE(feed.state.size() == components.size(), "feed {} has {} of {} components", feed.name,
               feed.state.size(), components.size());
    const double load = value_of(feed.load, t);
    for (std::size_t i = 0; i < components.size(); ++i) {
      const double factor = components[i].content.cod > 0.0 ? load : 1.0;
      states.push_back(factor * value_of(feed.state[i], t));
    }
  }
  return states;
}

}  // namespace

Operation::Operation(const Case& the_case, const FlowBalance& balance, Mode mode)
    : case_(the_case), balance_(balance), mode_(mode) {
  if (mode == Mode::mean) return;
  std::vector<bool> used(the_case.schedules.size(), false);
  for (const Flow& flow : the_case.flows) {
    if (flow.schedule) used[flow.schedule->value()] = true;
  }
  for (const Feed& feed : the_case.feeds) {
    if (feed.schedule) used[feed.schedule->value()] = true;
    const auto add = [&](const Recorded& recorded) {
      if (recorded.record) records_.push_back(&*recorded.record);
    };
    add(feed.flow);
    add(feed.load);
    std::ranges::for_each(feed.state, add);
  }
  for (std::size_t s = 0; s < used.size(); ++s) {
    if (used[s]) schedules_.push_back(&the_case.schedules[s].timeline);
  }
}

const OperatingPoint& Operation::at(double t) {
  std::vector<double> key;
  key.reserve(schedules_.size() + records_.size());
  for (const core::Timeline* schedule : schedules_) key.push_back(schedule->value_from(t));
  const std::vector<double> combination = key;
  for (const core::Timeline* record : records_) key.push_back(record->value_from(t));
  if (const auto known = points_.find(key); known != points_.end()) return known->second;

  if (points_.size() >= kMostPoints) points_.clear();
  OperatingPoint point;
  if (mode_ == Mode::mean) {
    point.rates = balance_.mean_rates(case_, 0.0);
    point.feed_state = feed_states(case_, 0.0);
  } else {
    point.rates = balance_.rates_at(case_, t);
    point.feed_state = feed_states(case_, t);
  }
  point.kind = kinds_.try_emplace(combination, kinds_.size()).first->second;
  return points_.emplace(std::move(key), std::move(point)).first->second;
}

std::optional<double> Operation::next_switch(double t) const {
  std::optional<double> next;
  const auto consider = [&](const core::Timeline* timeline) {
    const auto time = timeline->next_switch(t);
    if (time && (!next || *time < *next)) next = time;
  };
  std::ranges::for_each(schedules_, consider);
  std::ranges::for_each(records_, consider);
  return next;
}

std::vector<double> Operation::mean_rates(double from, double until) {
  SZ_REQUIRE(until > from, "mean from {} until {}", from, until);
  std::vector<double> mean(balance_.streams().size(), 0.0);
  double t = from;
  while (t < until) {
    const double end = std::min(next_switch(t).value_or(until), until);
    const auto& rates = at(t).rates;
    const double weight = (end - t) / (until - from);
    for (std::size_t s = 0; s < mean.size(); ++s) mean[s] += weight * rates[s];
    t = end;
  }
  return mean;
}

}  // namespace stillzone::network
