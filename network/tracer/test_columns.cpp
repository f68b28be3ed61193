#include "network/tracer/test_columns.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <utility>

#include "core/near_name.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

std::optional<std::size_t> find_column(ObjectReader& reader, const char* key,
                                       const core::CsvTable& table) {
  const auto name = reader.text(key, Need::required);
  if (!name) return std::nullopt;
  const auto column = table.column(*name);
  if (!column) {
    reader.fault(key, "\"" + *name + "\"", table.name() + " has no such column",
                 core::name_hint(*name, table.header()));
  }
  return column;
}

std::optional<core::UnitReader::Scale> read_scale(ObjectReader& reader, Measure measure) {
  if (!reader.has("unit")) {
    (void)reader.raw("unit");
    reader.fault("", "no \"unit\"", "the numbers of a column need their unit",
                 fmt::format("Add \"unit\", one of {}.", core::example_units(measure)));
    return std::nullopt;
  }
  const auto unit = reader.text("unit", Need::required);
  if (!unit) return std::nullopt;
  std::string problem;
  auto scale = reader.context().units.scale_of(*unit, measure, problem);
  if (!scale) {
    reader.fault("unit", "\"" + *unit + "\"", problem,
                 fmt::format("Write one of {}.", core::example_units(measure)));
  }
  return scale;
}

/// What the cells of a time column mean: a unit, or dates in a stated order.
bool read_kind_of_time(ObjectReader& time, const TestClock& clock, const core::CsvTable& table,
                       TimeColumn& column) {
  if (!time.has("dates")) {
    if (time.has("clock")) {
      (void)time.raw("clock");
      time.fault("clock", "\"clock\" without \"dates\"",
                 "a time of day belongs to a column of dates",
                 "Add \"dates\": \"day first\" (\"month first\", \"year first\").");
    }
    if (!time.has("unit")) {
      (void)time.raw("unit");
      (void)time.raw("dates");
      time.fault("", "neither \"unit\" nor \"dates\"", "times are elapsed or dates",
                 "Add \"unit\": \"d\", or \"dates\": \"day first\" (\"month first\", \"year "
                 "first\").");
      return false;
    }
    const auto scale = read_scale(time, Measure::duration);
    if (scale) column.scale = *scale;
    return scale.has_value();
  }
  static const std::array<std::string, 3> kOrders = {"year first", "day first", "month first"};
  const auto order = time.word("dates", kOrders, Need::required);
  if (order) column.dates = date_order_of(*order);
  column.epoch = clock.epoch();
  bool fine = order.has_value();
  if (time.has("clock")) {
    column.clock = find_column(time, "clock", table);
    fine = fine && column.clock;
  }
  if (time.has("unit")) {
    (void)time.raw("unit");
    time.fault("", "\"unit\" and \"dates\"", "times are elapsed or dates, not both",
               "Take one of the two out.");
    return false;
  }
  if (!clock.dated() && !clock.unreadable()) {
    time.fault("dates", core::shown(*time.raw("dates")),
               "where times are dates, the dose's \"at\" is a date too",
               "Write \"at\": \"2026-03-02 08:00\" in \"dose\".");
    fine = false;
  }
  return fine;
}

}  // namespace

std::optional<double> TestClock::read_start(ObjectReader& dose) {
  const core::Json* node = dose.raw("at");
  if (node == nullptr) return 0.0;
  if (node->is_string()) {
    const std::string text = node->get<std::string>();
    if (const auto days = read_date_time(text, DateOrder::year_first)) {
      dated_ = true;
      epoch_ = *days;
      return 0.0;
    }
    if (read_date_time(text, DateOrder::day_first) ||
        read_date_time(text, DateOrder::month_first)) {
      unreadable_ = true;
      dose.fault("at", core::shown(*node), "the date of a dose is written year first",
                 "Write it like \"2026-03-02 08:00\".");
      return std::nullopt;
    }
  }
  const auto at = dose.quantity<Measure::duration>("at", Need::required, {});
  unreadable_ = !at;
  if (!at) return std::nullopt;
  return at->value();
}

std::optional<TimeAndValue> read_time_and_value(ObjectReader& reader, const TestClock& clock,
                                                const core::CsvTable& table, Measure measure) {
  TimeAndValue columns;
  bool fine = true;
  auto time = reader.object("time", Need::required);
  if (time) {
    const auto number = find_column(*time, "column", table);
    if (number) columns.time.number = *number;
    fine = read_kind_of_time(*time, clock, table, columns.time) && number;
    time->finish();
  }
  auto value = reader.object("value", Need::required);
  if (value) {
    const auto number = find_column(*value, "column", table);
    const auto scale = read_scale(*value, measure);
    if (number) columns.value.number = *number;
    if (scale) columns.value.scale = *scale;
    fine = fine && number && scale;
    value->finish();
  }
  if (!time || !value || !fine) return std::nullopt;
  if (columns.time.number == columns.value.number) {
    value->fault("column", "\"" + table.header()[columns.value.number] + "\"",
                 "\"time\" and \"value\" are two columns", "Name the column of the values.");
    return std::nullopt;
  }
  return columns;
}

std::optional<double> CellReader::time(std::size_t row, const TimeColumn& column) {
  if (!column.dates) {
    const auto cell = number(row, column.number);
    if (!cell) return std::nullopt;
    return *cell * column.scale.scale + column.scale.offset;
  }
  const auto is_missing = [](std::string_view text) {
    return text.find_first_not_of(' ') == std::string_view::npos || text == "-" || text == "NA";
  };
  std::string cell(table_.cell(row, column.number));
  if (is_missing(cell)) return std::nullopt;
  if (column.clock) {
    // A day without its hour is no time of a sample.
    if (is_missing(table_.cell(row, *column.clock))) return std::nullopt;
    cell += " ";
    cell += table_.cell(row, *column.clock);
  }
  const auto days = read_date_time(cell, *column.dates);
  if (!days) {
    found_.add({.file = table_.name(),
                .pointer = "column " + table_.header()[column.number],
                .line = table_.line(row),
                .found = "\"" + cell + "\"",
                .allowed = fmt::format("a date and time belongs here, \"{}\"",
                                       date_order_name(*column.dates)),
                .way_out = date_time_way_out(cell, *column.dates)});
    return std::nullopt;
  }
  return *days - column.epoch;
}

std::optional<double> CellReader::number(std::size_t row, std::size_t column) {
  return table_.number(row, column, found_);
}

void CellReader::refuse(std::size_t row, std::size_t column, std::string allowed,
                        std::string way_out) {
  found_.add({.file = table_.name(),
              .pointer = "column " + table_.header()[column],
              .line = table_.line(row),
              .found = fmt::format("\"{}\"", table_.cell(row, column)),
              .allowed = std::move(allowed),
              .way_out = std::move(way_out)});
}

bool plausible_first_time(double first, int line, const TimeColumn& column, double dose_at,
                          const core::CsvTable& table, core::FaultList& faults) {
  if (column.dates || serial_day(dose_at)) return true;
  const auto day = serial_day(first);
  if (!day) return true;
  faults.add({.file = table.name(),
              .pointer = "column " + table.header()[column.number],
              .line = line,
              .found = fmt::format("{:g} d as the first time", first),
              .allowed = fmt::format("this looks like a spreadsheet's day number (for {})", *day),
              .way_out = "Give the column the format yyyy-mm-dd hh:mm, export it again and write "
                         "\"dates\": \"year first\" in place of \"unit\"."});
  return false;
}

bool CellReader::finish(core::FaultList& faults) {
  constexpr std::size_t kMost = 3;
  const auto& all = found_.all();
  for (std::size_t i = 0; i < std::min(all.size(), kMost); ++i) faults.add(all[i]);
  if (all.size() > kMost) {
    faults.add({.file = table_.name(),
                .found = fmt::format("{} more cell{} like these", all.size() - kMost,
                                     all.size() == kMost + 1 ? "" : "s"),
                .allowed = "the rest of the table was read too",
                .way_out = "Check that the right column is named."});
  }
  return all.empty();
}

}  // namespace stillzone::network
