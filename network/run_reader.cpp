#include <fmt/format.h>

#include <algorithm>
#include <array>

#include "core/near_name.hpp"
#include "network/case_reading.hpp"

namespace stillzone::network {

using core::Json;
using core::Measure;
using core::ObjectReader;
using Need = core::ObjectReader::Need;

namespace {

const std::array<std::string, 3> kKinds = {"steady", "periodic", "dynamic"};
const std::array<std::string, 3> kIntegrators = {"automatic", "multistep", "one-step"};

/// Components a zone's start may name, or gases a headspace's may.
std::vector<std::string> names_at(const kinetics::KineticModel& model, CaseReading::Kind kind) {
  std::vector<std::string> names;
  if (kind == CaseReading::Kind::zone) {
    for (const kinetics::Component& component : model.components) names.push_back(component.name);
  } else {
    for (const kinetics::Gas& gas : model.gases) names.push_back(gas.name);
  }
  return names;
}

std::string unit_of(const kinetics::KineticModel& model, CaseReading::Kind kind,
                    const std::string& name) {
  if (kind == CaseReading::Kind::zone) {
    const auto component = model.component(name);
    return component ? model.components[*component].unit : "the model's unit";
  }
  const auto gas = model.gas(name);
  return gas ? model.gases[*gas].unit : "the model's unit";
}

void read_place_start(CaseReading& reading, ObjectReader& start, const std::string& place_name) {
  const auto named = reading.places.find(place_name);
  const bool fits =
      named != reading.places.end() && (named->second.kind == CaseReading::Kind::zone ||
                                        named->second.kind == CaseReading::Kind::headspace);
  if (!fits) {
    std::vector<std::string> holders;
    for (const Zone& zone : reading.result.zones) holders.push_back(zone.name);
    for (const Headspace& headspace : reading.result.headspaces) holders.push_back(headspace.name);
    start.raw(place_name);
    start.fault(place_name, fmt::format("key \"{}\"", place_name),
                "a start is given for zones and headspaces", core::name_hint(place_name, holders));
    return;
  }
  const CaseReading::Kind kind = named->second.kind;
  const kinetics::KineticModel& model = reading.result.kinetics;
  const auto known = names_at(model, kind);
  auto& values = reading.result.run.given_start[place_name];
  start.each_member(
      place_name, Need::optional,
      [&](const std::string& name, const Json& node, const std::string& pointer) {
        const bool exists = kind == CaseReading::Kind::zone ? model.component(name).has_value()
                                                            : model.gas(name).has_value();
        const bool is_implicit =
            kind == CaseReading::Kind::zone &&
            std::any_of(model.implicits.begin(), model.implicits.end(),
                        [&](const kinetics::Implicit& implicit) { return implicit.name == name; });
        // A summary's state may be pasted as it stands: pH and the like follow from the rest.
        if (is_implicit) return;
        if (reading.has_kinetics && !exists) {
          reading.fault(pointer, fmt::format("\"{}\"", name),
                        fmt::format("the model \"{}\" has no such {}", model.name,
                                    kind == CaseReading::Kind::zone ? "component" : "gas"),
                        core::name_hint(name, known));
          return;
        }
        const auto value =
            read_model_number(reading, node, pointer, "a start value", unit_of(model, kind, name));
        if (value) values[name] = *value;
      });
}

void read_start(CaseReading& reading, ObjectReader& run) {
  RunSettings& settings = reading.result.run;
  const Json* node = run.raw("start");
  if (node == nullptr) return;
  if (node->is_object()) {
    settings.start = RunSettings::Start::given;
    auto start = run.object("start", Need::optional);
    if (!start) return;
    for (const std::string& place : start->keys()) read_place_start(reading, *start, place);
    for (const Zone& zone : reading.result.zones) {
      if (settings.given_start.contains(zone.name)) continue;
      reading.result.warnings.push_back(
          fmt::format("\"start\" does not name zone \"{}\": it starts as clean water", zone.name));
    }
    for (const Headspace& headspace : reading.result.headspaces) {
      if (settings.given_start.contains(headspace.name)) continue;
      reading.result.warnings.push_back(fmt::format(
          "\"start\" does not name headspace \"{}\": it starts with the model's seed gas",
          headspace.name));
    }
    return;
  }
  if (*node == "steady") {
    settings.start = RunSettings::Start::steady;
  } else if (*node == "seeded") {
    settings.start = RunSettings::Start::seeded;
  } else {
    run.fault("start", core::shown(*node),
              "a start is \"steady\", \"seeded\", or an object { PLACE: { COMPONENT: number } }",
              "");
  }
}

/// A steady run that starts at the steady state starts from the seed: there is nothing else.
RunSettings::Kind read_kind(ObjectReader& run) {
  const auto kind = run.word("kind", kKinds, Need::required);
  if (kind == "dynamic") return RunSettings::Kind::dynamic;
  if (kind == "periodic") return RunSettings::Kind::periodic;
  return RunSettings::Kind::steady;
}

void read_times(CaseReading& reading, ObjectReader& run) {
  RunSettings& settings = reading.result.run;
  const bool dynamic = settings.kind == RunSettings::Kind::dynamic;
  const auto until =
      run.quantity<Measure::duration>("until", dynamic ? Need::required : Need::optional,
                                      ObjectReader::positive(Measure::duration));
  const auto every = run.quantity<Measure::duration>("record_every", Need::optional,
                                                     ObjectReader::positive(Measure::duration));
  if (!dynamic || !until) return;
  settings.until = *until;
  settings.record_every = every.value_or(core::Duration(until->value() / 500.0));
  if (every && every->value() < until->value() / 1e6) {
    run.fault("record_every", fmt::format("{:g} records", until->value() / every->value()),
              "a run keeps at most 1000000 records", "Record less often.");
  }
}

}  // namespace

void read_run(CaseReading& reading, ObjectReader& root) {
  RunSettings& settings = reading.result.run;
  auto run = root.object("run", Need::optional);
  if (!run) return;
  settings.kind = read_kind(*run);
  read_start(reading, *run);
  if (settings.kind == RunSettings::Kind::steady && settings.start == RunSettings::Start::steady) {
    settings.start = RunSettings::Start::seeded;
  }
  read_times(reading, *run);
  if (const auto tolerance = run->number("tolerance", Need::optional)) {
    settings.tolerance = *tolerance;
    if (!(*tolerance >= 1e-12 && *tolerance <= 1e-2)) {
      run->fault("tolerance", fmt::format("{:g}", *tolerance),
                 "a relative tolerance lies between 1e-12 and 1e-2", "1e-6 is the default.");
    }
  }
  if (const auto integrator = run->word("integrator", kIntegrators, Need::optional)) {
    settings.integrator = *integrator;
  }
  run->finish();
}

}  // namespace stillzone::network
