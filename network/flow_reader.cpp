#include <fmt/format.h>

#include "core/near_name.hpp"
#include "network/case_reading.hpp"

namespace stillzone::network {

using core::Json;
using core::Measure;
using core::ObjectReader;
using Need = core::ObjectReader::Need;

namespace {

enum class End { from, to, exchange };

/// What each end of a flow may be, for messages.
std::string_view allowed_at(End end) {
  switch (end) {
    case End::from:
      return "a flow starts at a zone or a feed";
    case End::to:
      return "a flow ends at a zone or an outlet";
    case End::exchange:
      return "an exchange runs between two zones";
  }
  return "";
}

bool fits(End end, CaseReading::Kind kind) {
  if (kind == CaseReading::Kind::zone) return true;
  return (end == End::from && kind == CaseReading::Kind::feed) ||
         (end == End::to && kind == CaseReading::Kind::outlet);
}

std::string_view way_out_at(End end, CaseReading::Kind kind) {
  if (kind == CaseReading::Kind::headspace) {
    return "Water enters no headspace; gas goes there by a zone's \"gas\".";
  }
  if (end == End::exchange) return "Write a flow from a feed or to an outlet as \"from\", \"to\".";
  return "Swap \"from\" and \"to\" if it runs the other way.";
}

/// The place a name stands for; a fault at `pointer` when there is none that fits.
std::optional<Place> read_place(const CaseReading& reading, const std::string& name,
                                const std::string& pointer, End end) {
  const auto named = reading.places.find(name);
  if (named == reading.places.end()) {
    reading.fault(pointer, fmt::format("\"{}\"", name),
                  fmt::format("{}, and no place has this name", allowed_at(end)),
                  core::name_hint(name, reading.place_names));
    return std::nullopt;
  }
  const CaseReading::Named& place = named->second;
  if (!fits(end, place.kind)) {
    reading.fault(
        pointer,
        fmt::format("\"{}\" is {} {}", name, place.kind == CaseReading::Kind::outlet ? "an" : "a",
                    word_for(place.kind)),
        std::string(allowed_at(end)), std::string(way_out_at(end, place.kind)));
    return std::nullopt;
  }
  const auto kind = place.kind == CaseReading::Kind::zone   ? Place::Kind::zone
                    : place.kind == CaseReading::Kind::feed ? Place::Kind::feed
                                                            : Place::Kind::outlet;
  return Place{kind, place.index};
}

/// The two ends of an exchange: "between": ["core", "floor"].
bool read_between(const CaseReading& reading, ObjectReader& reader, Flow& flow) {
  const Json& node = *reader.raw("between");
  const std::string pointer = reader.pointer_to("between");
  if (!node.is_array() || node.size() != 2 || !node[0].is_string() || !node[1].is_string()) {
    reading.fault(pointer, core::shown(node), "an exchange names the two zones it runs between",
                  "Write \"between\": [\"ZONE\", \"ZONE\"].");
    return false;
  }
  const auto first = read_place(reading, node[0].get<std::string>(), pointer + "/0", End::exchange);
  const auto second =
      read_place(reading, node[1].get<std::string>(), pointer + "/1", End::exchange);
  if (!first || !second) return false;
  flow.from = *first;
  flow.to = *second;
  return true;
}

bool read_from_to(const CaseReading& reading, ObjectReader& reader, Flow& flow) {
  const auto from = reader.text("from", Need::required);
  const auto to = reader.text("to", Need::required);
  const auto first =
      from ? read_place(reading, *from, reader.pointer_to("from"), End::from) : std::nullopt;
  const auto second =
      to ? read_place(reading, *to, reader.pointer_to("to"), End::to) : std::nullopt;
  if (!first || !second) return false;
  flow.from = *first;
  flow.to = *second;
  return true;
}

ObjectReader::Limit flow_limit(bool exchange) {
  if (exchange) {
    return {.low = 0.0,
            .clause = "an exchange flow must be >= 0; it is what runs in each direction"};
  }
  return {.low = 0.0,
          .clause = "a one-way flow must be >= 0. Swap \"from\" and \"to\" to turn it round"};
}

void read_rate(CaseReading& reading, ObjectReader& reader, Flow& flow) {
  flow.given = reader.quantity<Measure::flow>(
      "flow", flow.exchange ? Need::required : Need::optional, flow_limit(flow.exchange));
  if (flow.exchange) {
    if (reader.raw("share") != nullptr) {
      reader.fault("share", "key \"share\"", "an exchange has no share: it moves no net water",
                   "Give its \"flow\", or make it two flows with \"from\" and \"to\".");
    }
  } else {
    flow.share = reader.quantity<Measure::share>(
        "share", Need::optional,
        {.low = 0.0, .high = 1.0, .clause = "a share must lie between 0 and 1"});
  }
  flow.schedule = reading.read_schedule_name(reader);
  if (flow.schedule && !reader.has("flow")) {
    reader.fault("schedule", "a schedule on a flow without \"flow\"",
                 "a schedule switches a given flow between its value and its idle part",
                 "Give \"flow\", the flow while it is on.");
  }
}

void read_one_flow(CaseReading& reading, const Json& node, const std::string& pointer) {
  ObjectReader reader(reading.context, node, pointer);
  if (!node.is_object()) return;
  Flow flow;
  flow.pointer = pointer;
  flow.exchange = reader.has("between");
  bool known = false;
  if (flow.exchange) {
    known = read_between(reading, reader, flow);
    for (const std::string_view key : {"from", "to"}) {
      if (reader.raw(key) == nullptr) continue;
      reader.fault(key, fmt::format("key \"{}\" beside \"between\"", key),
                   "a flow is one-way (\"from\", \"to\") or an exchange (\"between\")",
                   "Keep one of the two.");
    }
  } else if (!reader.has("from") && !reader.has("to")) {
    reader.fault("", "a flow without ends",
                 "a flow has \"from\" and \"to\" (one-way) or \"between\" (exchange)", "");
  } else {
    known = read_from_to(reading, reader, flow);
  }
  if (known && flow.from == flow.to) {
    reader.fault("", fmt::format("a flow from \"{}\" to itself", reading.result.name_of(flow.from)),
                 "a flow joins two different places", "Name another zone or take the flow out.");
    known = false;
  }
  read_rate(reading, reader, flow);
  reader.finish();
  if (known) reading.result.flows.push_back(std::move(flow));
}

}  // namespace

void read_outlets(CaseReading& reading, ObjectReader& root) {
  root.each_element("outlets", Need::required, [&](const Json& node, const std::string& pointer) {
    if (!node.is_string()) {
      reading.fault(pointer, core::shown(node), "an outlet is a name",
                    "Write \"outlets\": [\"overflow\"].");
      return;
    }
    const auto name = node.get<std::string>();
    reading.take_name(name, pointer, CaseReading::Kind::outlet, reading.result.outlets.size());
    reading.result.outlets.push_back({name});
  });
  const Json* outlets = root.raw("outlets");
  if (outlets != nullptr && outlets->is_array() && outlets->empty()) {
    root.fault("outlets", "no outlets", "a case has at least one outlet",
               "Write \"outlets\": [\"overflow\"].");
  }
}

void read_schedules(CaseReading& reading, ObjectReader& root) {
  root.each_member("schedules", Need::optional,
                   [&](const std::string& name, const Json& node, const std::string& pointer) {
                     ObjectReader reader(reading.context, node, pointer);
                     Schedule schedule;
                     schedule.name = name;
                     if (node.is_object()) {
                       if (auto timeline = core::read_schedule(reader))
                         schedule.timeline = std::move(*timeline);
                     }
                     reading.schedules[name] = reading.result.schedules.size();
                     reading.schedule_names.push_back(name);
                     reading.schedule_used.push_back(false);
                     reading.result.schedules.push_back(std::move(schedule));
                   });
}

void read_flows(CaseReading& reading, ObjectReader& root) {
  root.each_element("flows", Need::required, [&](const Json& node, const std::string& pointer) {
    read_one_flow(reading, node, pointer);
  });
  const Json* flows = root.raw("flows");
  if (flows != nullptr && flows->is_array() && flows->empty()) {
    root.fault("flows", "no flows", "flows join the feeds, the zones and the outlets",
               "Write them as { \"from\": \"PLACE\", \"to\": \"PLACE\" }.");
  }
}

}  // namespace stillzone::network
