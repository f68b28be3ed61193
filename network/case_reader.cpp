#include <fmt/format.h>

#include <algorithm>
#include <array>

#include "core/near_name.hpp"
#include "network/case_reading.hpp"

namespace stillzone::network {

using core::ObjectReader;
using Need = core::ObjectReader::Need;

namespace {

/// Other kinds of input file, and the command that takes each.
struct OtherFile {
  std::string_view kind;
  std::string_view way_out;
};
constexpr std::array kOtherFiles = {
    OtherFile{"test/1", "A tracer test goes to \"stillzone tracer\" or \"stillzone plan\"."},
    OtherFile{"study/1", "A study goes to \"stillzone retrofit\"."},
    OtherFile{"model/1",
              "A model file goes to \"stillzone model\", or into a case as its \"kinetics\"."},
};

/// Keys of the format that later versions understand.
struct LaterKey {
  std::string_view key;
  std::string_view way_out;
};
constexpr std::array kLaterKeys = {
    LaterKey{"mixers", "Take it out and give what the mixers move as exchange flows."},
    LaterKey{"observed", "Take it out."},
};

/// True when the file says that it is a case; else one fault, and the rest is not worth reading.
bool is_a_case(const CaseReading& reading, ObjectReader& root) {
  const core::Json* kind = root.raw("stillzone");
  if (kind == nullptr) {
    root.fault("", "no key \"stillzone\"", "a case starts with \"stillzone\": \"case/1\"",
               "Add it as the first key.");
    return false;
  }
  if (kind->is_string() && kind->get<std::string>() == "case/1") return true;
  std::string way_out = "Write \"stillzone\": \"case/1\".";
  if (kind->is_string()) {
    const auto other = std::ranges::find(kOtherFiles, kind->get<std::string>(), &OtherFile::kind);
    if (other != kOtherFiles.end()) way_out = std::string(other->way_out);
  }
  reading.fault("/stillzone", core::shown(*kind), "this command takes a case, \"case/1\"",
                std::move(way_out));
  return false;
}

void read_kinetics(CaseReading& reading, ObjectReader& root) {
  const core::Json* node = root.raw("kinetics");
  if (node == nullptr) {
    const auto shipped = kinetics::shipped_models();
    root.fault("", "no key \"kinetics\"", "a case says which kinetic model works in its zones",
               fmt::format("Name a shipped model ({}) or a path to a model file.",
                           fmt::join(shipped, ", ")));
    return;
  }
  auto model = kinetics::load_model(reading.context, *node, root.pointer_to("kinetics"));
  if (!model) return;
  reading.result.kinetics = std::move(*model);
  reading.has_kinetics = true;
}

void refuse_later_keys(CaseReading& reading, ObjectReader& root) {
  for (const LaterKey& later : kLaterKeys) {
    if (root.raw(later.key) == nullptr) continue;
    reading.fault(root.pointer_to(later.key), fmt::format("key \"{}\"", later.key),
                  "it belongs to the format, but this version does not have it yet",
                  std::string(later.way_out));
  }
}

/// A model without gases has no use for headspaces: they are left out, with a warning.
void leave_gas_out(Case& the_case) {
  if (the_case.headspaces.empty() || !the_case.kinetics.gases.empty()) return;
  for (const Headspace& headspace : the_case.headspaces) {
    the_case.run.given_start.erase(headspace.name);
  }
  the_case.headspaces.clear();
  for (Zone& zone : the_case.zones) zone.gas.reset();
  the_case.warnings.push_back(
      fmt::format("the model \"{}\" has no gases: headspaces and gas transfer play no part",
                  the_case.kinetics.name));
}

/// Zones at temperatures for which the model's rates are not meant.
void warn_of_temperatures(Case& result) {
  const auto& range = result.kinetics.temperature_range;
  if (!range) return;
  for (const Zone& zone : result.zones) {
    const double at = zone.temperature.value();
    if (at >= range->first && at <= range->second) continue;
    result.warnings.push_back(fmt::format(
        "zone \"{}\" is at {:.1f} degC; the rates of model \"{}\" are meant for {:.0f} to {:.0f} "
        "degC, and what it gives here is extrapolated",
        zone.name, at - 273.15, result.kinetics.name, range->first - 273.15,
        range->second - 273.15));
  }
}

void collect_warnings(CaseReading& reading) {
  Case& the_case = reading.result;
  for (std::size_t h = 0; h < the_case.headspaces.size(); ++h) {
    const bool used = std::ranges::any_of(
        the_case.zones, [h](const Zone& zone) { return zone.gas && zone.gas->to.value() == h; });
    if (!used) {
      the_case.warnings.push_back(
          fmt::format("headspace \"{}\" takes gas from no zone", the_case.headspaces[h].name));
    }
  }
  for (std::size_t s = 0; s < the_case.schedules.size(); ++s) {
    if (reading.schedule_used[s]) continue;
    the_case.warnings.push_back(
        fmt::format("schedule \"{}\" switches nothing", the_case.schedules[s].name));
  }
}

}  // namespace

std::string_view word_for(CaseReading::Kind kind) {
  switch (kind) {
    case CaseReading::Kind::zone:
      return "zone";
    case CaseReading::Kind::headspace:
      return "headspace";
    case CaseReading::Kind::feed:
      return "feed";
    case CaseReading::Kind::outlet:
      return "outlet";
  }
  return "place";
}

ObjectReader::Limit liquid_temperature_limit() {
  return {.low = 273.15,
          .high = 373.15,
          .low_open = false,
          .clause = "a temperature must lie between 0 and 100 degC"};
}

void CaseReading::fault(const std::string& pointer, std::string found, std::string allowed,
                        std::string way_out) const {
  context.faults.add({.file = context.document.name(),
                      .pointer = pointer,
                      .line = context.document.line_of(pointer),
                      .found = std::move(found),
                      .allowed = std::move(allowed),
                      .way_out = std::move(way_out)});
}

void CaseReading::take_name(const std::string& name, const std::string& pointer, Kind kind,
                            std::size_t index) {
  const std::string found = fmt::format("{} name \"{}\"", word_for(kind), name);
  constexpr std::string_view kAllowed =
      "a name is 1 to 60 characters without \".\", \"/\", quotes, commas, line ends, or blanks at "
      "its ends";
  const bool blank_end = !name.empty() && (name.front() == ' ' || name.back() == ' ');
  const bool odd = std::ranges::any_of(name, [](char c) {
    constexpr std::string_view kRefused = "./\",\\";
    return kRefused.find(c) != std::string_view::npos || static_cast<unsigned char>(c) < 0x20;
  });
  if (name.empty() || name.size() > 60 || blank_end || odd) {
    fault(pointer, found, std::string(kAllowed),
          "Rename it; results are columns named PLACE.QUANTITY.");
  }
  const auto [taken, is_new] = places.try_emplace(name, Named{kind, index, pointer});
  if (is_new) {
    place_names.push_back(name);
    return;
  }
  fault(pointer, found,
        fmt::format("a {} has this name already ({})", word_for(taken->second.kind),
                    taken->second.pointer),
        "Every zone, headspace, feed and outlet needs a name of its own.");
}

std::optional<ScheduleIndex> CaseReading::read_schedule_name(ObjectReader& reader) {
  const auto name = reader.text("schedule", Need::optional);
  if (!name) return std::nullopt;
  const auto found = schedules.find(*name);
  if (found == schedules.end()) {
    reader.fault("schedule", fmt::format("\"{}\"", *name),
                 "it must name one of the case's \"schedules\"",
                 schedule_names.empty() ? "Add it to \"schedules\"."
                                        : core::name_hint(*name, schedule_names));
    return std::nullopt;
  }
  schedule_used[found->second] = true;
  return ScheduleIndex(found->second);
}

std::optional<Case> read_case(const core::JsonDocument& document, const core::UnitReader& units,
                              core::FaultList& faults) {
  const std::size_t n_faults_before = faults.all().size();
  std::vector<core::FreeQuantity> free_quantities;
  std::vector<std::string> notes;
  const core::ReadingContext context{document, units, faults, free_quantities, &notes};
  CaseReading reading(context);
  ObjectReader root(context, document.root(), "");
  if (!document.root().is_object() || !is_a_case(reading, root)) return std::nullopt;

  reading.result.title = root.text("title", Need::optional).value_or("");
  read_kinetics(reading, root);
  if (const auto temperature = root.quantity<core::Measure::temperature>(
          "temperature", Need::required, liquid_temperature_limit())) {
    reading.result.temperature = *temperature;
  }
  read_headspaces(reading, root);
  read_zones(reading, root);
  read_schedules(reading, root);
  read_feeds(reading, root);
  read_outlets(reading, root);
  read_flows(reading, root);
  read_run(reading, root);
  reading.result.joint_spread = read_joint_spread(root, free_quantities);
  refuse_later_keys(reading, root);
  root.finish();

  if (faults.all().size() > n_faults_before) return std::nullopt;
  leave_gas_out(reading.result);
  collect_warnings(reading);
  warn_of_temperatures(reading.result);
  reading.result.free_quantities = std::move(free_quantities);
  reading.result.warnings.insert(reading.result.warnings.end(), notes.begin(), notes.end());
  return std::move(reading.result);
}

}  // namespace stillzone::network
