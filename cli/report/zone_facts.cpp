#include "cli/report/zone_facts.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "cli/report/page.hpp"

namespace stillzone::cli {

namespace {

using Kind = network::Place::Kind;

/// Number of a place's box: zones, then feeds, then outlets.
std::size_t box_of(const network::Case& the_case, network::Place place) {
  if (place.kind == Kind::zone) return place.index;
  if (place.kind == Kind::feed) return the_case.zones.size() + place.index;
  return the_case.zones.size() + the_case.feeds.size() + place.index;
}

void add_arrows(const RunReportInput& input, const NetworkFacts& facts, NetworkDrawing& drawing) {
  const auto streams = input.balance.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const network::Stream& stream = streams[s];
    NetworkDrawing::Arrow arrow;
    arrow.from = box_of(input.the_case, stream.from);
    arrow.to = box_of(input.the_case, stream.to);
    arrow.flow = facts.rates[s];
    arrow.exchange = input.the_case.flows[stream.flow].exchange;
    arrow.short_circuit = stream.from.kind == Kind::feed && stream.to.kind == Kind::outlet;
    if (arrow.exchange && s + 1 < streams.size() && streams[s + 1].flow == stream.flow) {
      arrow.back = facts.rates[++s];
    }
    drawing.arrows.push_back(arrow);
  }
}

}  // namespace

NetworkFacts network_facts(const RunReportInput& input) {
  NetworkFacts facts;
  const network::Case& the_case = input.the_case;
  const auto streams = input.balance.streams();
  for (const auto& flow : input.result.flows) facts.rates.push_back(flow.flow);
  if (facts.rates.size() != streams.size()) {
    facts.rates = input.balance.mean_rates(the_case, input.result.until);
  }
  facts.zones.resize(the_case.zones.size());
  std::vector<double> inflow(the_case.zones.size(), 0.0);
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const auto& [from, to, flow] = streams[s];
    const double rate = facts.rates[s];
    const bool fed = from.kind == Kind::feed;
    const bool drawn = to.kind == Kind::outlet;
    if (fed) facts.feed += rate;
    if (fed && drawn) facts.bypass += rate;
    if (to.kind == Kind::zone) inflow[to.index] += rate;
    if (fed && to.kind == Kind::zone) facts.zones[to.index].feed += rate;
    if (drawn && from.kind == Kind::zone) facts.zones[from.index].drawn += rate;
  }
  for (const auto& zone : the_case.zones) facts.volume += zone.volume.value();
  facts.retention = facts.volume / facts.feed;
  for (std::size_t z = 0; z < facts.zones.size(); ++z) {
    ZoneFacts& zone = facts.zones[z];
    zone.turnover = the_case.zones[z].volume.value() / inflow[z];
    zone.stagnant = zone.turnover > kStagnantTurnovers * facts.retention;
    // Where feed and outlet meet in what is most of the tank, nothing is cut short.
    zone.short_circuit = zone.feed > 0.0 && zone.drawn > 0.0 &&
                         the_case.zones[z].volume.value() < 0.5 * facts.volume;
  }
  return facts;
}

NetworkDrawing network_drawing(const RunReportInput& input, const NetworkFacts& facts) {
  const network::Case& the_case = input.the_case;
  NetworkDrawing drawing;
  for (std::size_t z = 0; z < the_case.zones.size(); ++z) {
    const network::Zone& zone = the_case.zones[z];
    NetworkDrawing::Box box;
    box.name = zone.name;
    box.volume = zone.volume.value();
    box.note =
        fmt::format("{} m\u00B3, {} d", brief(box.volume, 3), brief(facts.zones[z].turnover, 2));
    box.stagnant = facts.zones[z].stagnant;
    box.short_circuit = facts.zones[z].short_circuit;
    if (zone.gas) box.headspace = zone.gas->to.value();
    drawing.boxes.push_back(box);
  }
  std::vector<double> fed(the_case.feeds.size(), 0.0);
  std::vector<double> drawn(the_case.outlets.size(), 0.0);
  const auto streams = input.balance.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    if (streams[s].from.kind == Kind::feed) fed[streams[s].from.index] += facts.rates[s];
    if (streams[s].to.kind == Kind::outlet) drawn[streams[s].to.index] += facts.rates[s];
  }
  const auto add_end = [&](NetworkDrawing::Box::Kind kind, const std::string& name, double flow) {
    NetworkDrawing::Box box;
    box.kind = kind;
    box.name = name;
    box.note = brief(flow, 3) + " m\u00B3/d";
    drawing.boxes.push_back(box);
  };
  for (std::size_t f = 0; f < fed.size(); ++f) {
    add_end(NetworkDrawing::Box::Kind::feed, the_case.feeds[f].name, fed[f]);
  }
  for (std::size_t o = 0; o < drawn.size(); ++o) {
    add_end(NetworkDrawing::Box::Kind::outlet, the_case.outlets[o].name, drawn[o]);
  }
  for (const auto& headspace : the_case.headspaces) {
    NetworkDrawing::Dome dome;
    dome.name = headspace.name;
    for (const auto& result : input.result.headspaces) {
      if (result.name != headspace.name) continue;
      dome.note = fmt::format("{} m\u00B3/d CH\u2084", brief(result.mean_methane_flow_normal, 3));
    }
    drawing.domes.push_back(dome);
  }
  add_arrows(input, facts, drawing);
  return drawing;
}

std::optional<network::NamedValue> value_at(const network::PlaceState& place,
                                            const std::string& name) {
  for (const auto* list : {&place.state, &place.derived}) {
    const auto found = std::find_if(list->begin(), list->end(),
                                    [&](const auto& value) { return value.name == name; });
    if (found != list->end()) return *found;
  }
  return std::nullopt;
}

}  // namespace stillzone::cli
