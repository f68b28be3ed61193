#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "core/json_reader.hpp"
#include "network/case.hpp"

namespace stillzone::network {

/// A case while it is read: what is known so far, and the names that later parts may refer to.
/// Used by the readers of the case file only (case_reader.cpp and its neighbours).
struct CaseReading {
  explicit CaseReading(const core::ReadingContext& reading_context) : context(reading_context) {}

  const core::ReadingContext& context;
  Case result;
  bool has_kinetics = false;  ///< result.kinetics was read; else component names go unchecked

  /// What carries a place's name: for "unique over all places" and for flows and start states.
  enum class Kind { zone, headspace, feed, outlet };
  struct Named {
    Kind kind = Kind::zone;
    std::size_t index = 0;
    std::string pointer;
  };
  std::unordered_map<std::string, Named> places;
  std::vector<std::string> place_names;  ///< in file order, for hints
  std::unordered_map<std::string, std::size_t> schedules;
  std::vector<std::string> schedule_names;
  std::vector<bool> schedule_used;

  /// Takes a name into use; a fault when it is empty, has '.' or '/', or is taken.
  void take_name(const std::string& name, const std::string& pointer, Kind kind, std::size_t index);
  void fault(const std::string& pointer, std::string found, std::string allowed,
             std::string way_out) const;
  /// Reads "schedule" of a feed or flow: the schedule's index, or nothing (fault when unknown).
  std::optional<ScheduleIndex> read_schedule_name(core::ObjectReader& reader);
};

/// "zone", "headspace", "feed", "outlet".
[[nodiscard]] std::string_view word_for(CaseReading::Kind kind);

/// 0 to 100 degC.
[[nodiscard]] core::ObjectReader::Limit liquid_temperature_limit();

void read_headspaces(CaseReading& reading, core::ObjectReader& root);
void read_zones(CaseReading& reading, core::ObjectReader& root);
void read_feeds(CaseReading& reading, core::ObjectReader& root);
void read_outlets(CaseReading& reading, core::ObjectReader& root);
void read_schedules(CaseReading& reading, core::ObjectReader& root);
void read_flows(CaseReading& reading, core::ObjectReader& root);
void read_run(CaseReading& reading, core::ObjectReader& root);

/// Reads a number in the model's own unit that must be >= 0: bare, or {"value", "fit", "spread"}.
/// @param what "a component of the state", for the message
/// @param unit of the model, for the message
std::optional<double> read_model_number(const CaseReading& reading, const core::Json& node,
                                        const std::string& pointer, std::string_view what,
                                        std::string_view unit);

}  // namespace stillzone::network
