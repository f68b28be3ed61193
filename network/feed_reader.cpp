#include <fmt/format.h>

#include <cmath>

#include "core/near_name.hpp"
#include "network/case_reading.hpp"

namespace stillzone::network {

using core::Json;
using core::Measure;
using core::ObjectReader;
using Need = core::ObjectReader::Need;

namespace {

bool is_record(const Json& node) { return node.is_object() && node.contains("csv"); }

/// Walks the steps of a record and refuses values below 0, naming the first.
void refuse_negative(const CaseReading& reading, const core::Timeline& record,
                     const std::string& pointer, std::string_view what) {
  std::optional<double> time = -1e30;
  while (time) {
    const double value = record.value_from(*time);
    if (!(value >= 0.0)) {
      reading.fault(pointer,
                    *time < -1e29 ? fmt::format("the record starts with {:g}", value)
                                  : fmt::format("the record has {:g} at {:g} d", value, *time),
                    fmt::format("{} must be >= 0", what), "Correct the table.");
      return;
    }
    time = record.next_switch(*time);
  }
}

/// A record object below `pointer`. @param measure none for numbers in the model's own unit
std::optional<Recorded> read_recorded(const CaseReading& reading, const Json& node,
                                      const std::string& pointer, std::optional<Measure> measure,
                                      std::string_view what) {
  ObjectReader reader(reading.context, node, pointer);
  auto record = core::read_record(reader, measure);
  if (!record) return std::nullopt;
  refuse_negative(reading, *record, pointer, what);
  return Recorded{record->value_from(-1e30), std::move(record)};
}

Recorded read_flow(const CaseReading& reading, ObjectReader& feed) {
  if (feed.has("flow")) {
    const Json& node = *feed.raw("flow");
    if (is_record(node)) {
      return read_recorded(reading, node, feed.pointer_to("flow"), Measure::flow, "a feed's flow")
          .value_or(Recorded{});
    }
  }
  const auto flow = feed.quantity<Measure::flow>("flow", Need::required,
                                                 ObjectReader::not_negative(Measure::flow));
  return {flow.value_or(core::FlowRate()).value(), {}};
}

Recorded read_load(const CaseReading& reading, ObjectReader& feed) {
  const Json* node = feed.raw("load");
  if (node == nullptr) return {1.0, {}};
  const std::string pointer = feed.pointer_to("load");
  constexpr std::string_view kWhat = "a load factor";
  if (is_record(*node)) {
    return read_recorded(reading, *node, pointer, std::nullopt, kWhat).value_or(Recorded{1.0, {}});
  }
  return {read_model_number(reading, *node, pointer, kWhat, "1").value_or(1.0), {}};
}

std::vector<std::string> component_names(const kinetics::KineticModel& model) {
  std::vector<std::string> names;
  for (const kinetics::Component& component : model.components) names.push_back(component.name);
  return names;
}

std::vector<Recorded> read_state(const CaseReading& reading, ObjectReader& feed) {
  const kinetics::KineticModel& model = reading.result.kinetics;
  std::vector<Recorded> state(model.components.size());
  constexpr std::string_view kWhat = "a component of the state";
  feed.each_member(
      "state", Need::required,
      [&](const std::string& name, const Json& node, const std::string& pointer) {
        const auto component = model.component(name);
        if (reading.has_kinetics && !component) {
          reading.fault(pointer, fmt::format("component \"{}\"", name),
                        fmt::format("the model \"{}\" has no such component", model.name),
                        core::name_hint(name, component_names(model)));
          return;
        }
        const std::string unit = component ? model.components[*component].unit : "the model's unit";
        Recorded value;
        if (is_record(node)) {
          value = read_recorded(reading, node, pointer, std::nullopt, kWhat).value_or(Recorded{});
        } else {
          value.value = read_model_number(reading, node, pointer, kWhat, unit).value_or(0.0);
        }
        if (component) state[*component] = std::move(value);
      });
  return state;
}

/// What a feed carries: "state", or (in a later version) "sludge".
std::vector<Recorded> read_content(const CaseReading& reading, ObjectReader& feed) {
  if (feed.raw("sludge") != nullptr) {
    feed.fault("sludge", "key \"sludge\"",
               "it belongs to the format, but this version does not have it yet",
               "Give the feed's \"state\" in the components of the model instead.");
    if (!feed.has("state")) return {};
  }
  return read_state(reading, feed);
}

}  // namespace

std::optional<double> read_model_number(const CaseReading& reading, const Json& node,
                                        const std::string& pointer, std::string_view what,
                                        std::string_view unit) {
  const std::string allowed =
      unit == "1" ? fmt::format("{} is a number >= 0", what)
                  : fmt::format("{} is a number >= 0 in {}, the unit of the model", what, unit);
  if (node.is_number()) {
    const double value = node.get<double>();
    if (std::isfinite(value) && value >= 0.0) return value;
    reading.fault(pointer, core::shown(node), allowed, "");
    return std::nullopt;
  }
  if (node.is_object() && node.contains("value")) {
    return core::read_quantity(reading.context, node, pointer, Measure::share,
                               {.low = 0.0, .clause = allowed});
  }
  reading.fault(pointer, core::shown(node), allowed, "Write it without a unit.");
  return std::nullopt;
}

void read_feeds(CaseReading& reading, ObjectReader& root) {
  root.each_member("feeds", Need::required,
                   [&](const std::string& name, const Json& node, const std::string& pointer) {
                     reading.take_name(name, pointer, CaseReading::Kind::feed,
                                       reading.result.feeds.size());
                     ObjectReader reader(reading.context, node, pointer);
                     Feed feed;
                     feed.name = name;
                     if (node.is_object()) {
                       feed.flow = read_flow(reading, reader);
                       feed.schedule = reading.read_schedule_name(reader);
                       feed.state = read_content(reading, reader);
                       feed.load = read_load(reading, reader);
                       reader.finish();
                     }
                     reading.result.feeds.push_back(std::move(feed));
                   });
  const Json* feeds = root.raw("feeds");
  if (feeds != nullptr && feeds->is_object() && feeds->empty()) {
    root.fault("feeds", "no feeds", "a case has at least one feed",
               "Add one with its \"flow\" and \"state\".");
  }
}

}  // namespace stillzone::network
