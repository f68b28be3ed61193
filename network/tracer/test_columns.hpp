#pragma once

#include <cstddef>
#include <optional>
#include <string>

#include "core/csv_table.hpp"
#include "core/json_reader.hpp"
#include "network/tracer/sample_time.hpp"

namespace stillzone::network {

/// How the times of one test are written: elapsed ("0 d") or dates ("2026-03-02 08:00"). Where they
/// are dates, model time 0 is the dose, and a column of elapsed times counts from the dose.
class TestClock {
 public:
  /// "at" of a dose: "0 d" or a date and time, year first. @return [d] of model time.
  std::optional<double> read_start(core::ObjectReader& dose);
  [[nodiscard]] bool dated() const { return dated_; }
  /// True when "at" could not be read: nothing more is said about dates then.
  [[nodiscard]] bool unreadable() const { return unreadable_; }
  /// [d] since 1970 of model time 0; only when dated().
  [[nodiscard]] double epoch() const { return epoch_; }

 private:
  bool dated_ = false;
  bool unreadable_ = false;
  double epoch_ = 0.0;
};

/// A column of times, {"column", "unit"} or {"column", "dates": "day first"}; with dates, the time
/// of day may stand in a column of its own, "clock".
struct TimeColumn {
  std::size_t number = 0;
  std::optional<std::size_t> clock;  ///< column of the time of day
  core::UnitReader::Scale scale;     ///< cell -> [d] of model time
  std::optional<DateOrder> dates;    ///< cells are dates; scale plays no part
  double epoch = 0.0;                ///< [d] since 1970 of model time 0
};
/// A column of values, {"column", "unit"}.
struct ValueColumn {
  std::size_t number = 0;
  core::UnitReader::Scale scale;  ///< cell -> internal unit of the measure
};
struct TimeAndValue {
  TimeColumn time;
  ValueColumn value;
};

/// Reads "time" and "value" of a sampling point or a record against the header of its table. All
/// faults of both are reported; nothing is returned when there was one.
std::optional<TimeAndValue> read_time_and_value(core::ObjectReader& reader, const TestClock& clock,
                                                const core::CsvTable& table, core::Measure measure);

/// False, with a fault, when the first time [d] of an elapsed column is a spreadsheet's day number:
/// a test of 120 years would follow.
bool plausible_first_time(double first, int line, const TimeColumn& column, double dose_at,
                          const core::CsvTable& table, core::FaultList& faults);

/// Reads cells of one table. Of many faults the first few are kept and the rest counted, so that a
/// wrong column does not bury the other messages.
class CellReader {
 public:
  explicit CellReader(const core::CsvTable& table) : table_(table) {}

  /// Model time [d]; empty for a missing cell or a fault.
  std::optional<double> time(std::size_t row, const TimeColumn& column);
  /// A number as written; empty for a missing cell or a fault.
  std::optional<double> number(std::size_t row, std::size_t column);
  void refuse(std::size_t row, std::size_t column, std::string allowed, std::string way_out);
  /// Hands the faults over. @return true when there were none.
  bool finish(core::FaultList& faults);

 private:
  const core::CsvTable& table_;
  core::FaultList found_;
};

}  // namespace stillzone::network
