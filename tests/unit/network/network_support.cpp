#include "tests/unit/network/network_support.hpp"

#include <algorithm>
#include <fstream>
#include <sstream>
#include <stdexcept>

namespace stillzone::network {

NetworkSketch& NetworkSketch::zone(const std::string& name, double volume) {
  case_.zones.push_back({name, core::Volume(volume), core::Temperature(308.15), {}});
  return *this;
}

NetworkSketch& NetworkSketch::feed(const std::string& name, double flow) {
  Feed feed;
  feed.name = name;
  feed.flow = {flow, {}};
  case_.feeds.push_back(std::move(feed));
  return *this;
}

NetworkSketch& NetworkSketch::outlet(const std::string& name) {
  case_.outlets.push_back({name});
  return *this;
}

NetworkSketch& NetworkSketch::schedule(const std::string& name, core::Timeline::Periodic periodic,
                                       double idle) {
  case_.schedules.push_back({name, core::Timeline::switched(periodic, {}, {}, idle)});
  return *this;
}

ScheduleIndex NetworkSketch::schedule_index(const std::string& name) const {
  const auto found = std::ranges::find(case_.schedules, name, &Schedule::name);
  return ScheduleIndex(static_cast<std::size_t>(found - case_.schedules.begin()));
}

NetworkSketch& NetworkSketch::feed_follows(const std::string& schedule) {
  case_.feeds.back().schedule = schedule_index(schedule);
  return *this;
}

NetworkSketch& NetworkSketch::flow_follows(const std::string& schedule) {
  case_.flows.back().schedule = schedule_index(schedule);
  return *this;
}

NetworkSketch& NetworkSketch::feed_record(std::vector<double> times, std::vector<double> flows) {
  case_.feeds.back().flow = {flows.front(), core::Timeline::steps(std::move(times), flows)};
  return *this;
}

Place NetworkSketch::place(const std::string& name) const {
  const auto index_in = [&](const auto& places) -> std::optional<std::size_t> {
    for (std::size_t i = 0; i < places.size(); ++i) {
      if (places[i].name == name) return i;
    }
    return std::nullopt;
  };
  if (const auto i = index_in(case_.zones)) return {Place::Kind::zone, *i};
  if (const auto i = index_in(case_.feeds)) return {Place::Kind::feed, *i};
  if (const auto i = index_in(case_.outlets)) return {Place::Kind::outlet, *i};
  throw std::invalid_argument("no place " + name);
}

Flow& NetworkSketch::add_flow(const std::string& from, const std::string& to) {
  Flow flow;
  flow.from = place(from);
  flow.to = place(to);
  flow.pointer = "/flows/" + std::to_string(case_.flows.size());
  case_.flows.push_back(std::move(flow));
  return case_.flows.back();
}

NetworkSketch& NetworkSketch::given(const std::string& from, const std::string& to, double flow) {
  add_flow(from, to).given = core::FlowRate(flow);
  return *this;
}

NetworkSketch& NetworkSketch::share(const std::string& from, const std::string& to, double share) {
  add_flow(from, to).share = core::Share(share);
  return *this;
}

NetworkSketch& NetworkSketch::rest(const std::string& from, const std::string& to) {
  add_flow(from, to);
  return *this;
}

NetworkSketch& NetworkSketch::exchange(const std::string& a, const std::string& b, double flow) {
  Flow& line = add_flow(a, b);
  line.exchange = true;
  line.given = core::FlowRate(flow);
  return *this;
}

Balanced balanced(const Case& the_case) {
  core::FaultList faults;
  const auto document = core::JsonDocument::parse("{}", "net.json", "", faults);
  Balanced result;
  result.balance = FlowBalance::solve(the_case, *document, faults);
  for (core::Fault fault : faults.all()) {
    fault.line = 0;  // a sketch has no lines
    result.faults += fault.text() + "\n";
  }
  return result;
}

std::vector<double> rates_of(const Case& the_case) {
  const Balanced result = balanced(the_case);
  if (!result.balance) throw std::invalid_argument(result.faults);
  return result.balance->mean_rates(the_case, 0.0);
}

std::string file_text(const std::string& path) {
  std::ifstream file(std::string(STILLZONE_SOURCE_DIR) + "/" + path, std::ios::binary);
  if (!file) throw std::invalid_argument("cannot read " + path);
  std::ostringstream text;
  text << file.rdbuf();
  return text.str();
}

}  // namespace stillzone::network
