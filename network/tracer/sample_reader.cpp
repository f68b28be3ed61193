#include "network/tracer/sample_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>
#include <vector>

#include "core/csv_table.hpp"
#include "core/near_name.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

/// Standard deviation of a value: an absolute part and one in proportion.
struct ErrorModel {
  double absolute = 0.0;  ///< [g/m3]
  double relative = 0.0;  ///< [1]
  [[nodiscard]] double at(double value) const { return std::hypot(absolute, relative * value); }
};

/// A column of the sampling point's CSV, and how its cells become internal units.
struct Column {
  std::size_t number = 0;
  core::UnitReader::Scale scale;
};

std::optional<std::size_t> find_column(ObjectReader& reader, const core::CsvTable& table) {
  const auto name = reader.text("column", Need::required);
  if (!name) return std::nullopt;
  const auto column = table.column(*name);
  if (!column) {
    reader.fault("column", "\"" + *name + "\"", table.name() + " has no such column",
                 core::name_hint(*name, table.header()));
  }
  return column;
}

std::optional<core::UnitReader::Scale> read_scale(ObjectReader& reader, Measure measure) {
  const auto unit = reader.text("unit", Need::required);
  if (!unit) return std::nullopt;
  std::string problem;
  auto scale = reader.context().units.scale_of(*unit, measure, problem);
  if (!scale) {
    reader.fault("unit", "\"" + *unit + "\"", problem,
                 fmt::format("Write a unit such as {}.", core::example_units(measure)));
  }
  return scale;
}

/// One part of "error": "0.10 g/m3" or "3 %".
void add_error_part(const core::ReadingContext& context, const core::Json& node,
                    const std::string& pointer, ErrorModel& error) {
  const std::string text = node.is_string() ? node.get<std::string>() : std::string();
  if (!text.empty() && text.back() == '%') {
    const auto share = core::read_quantity(context, node, pointer, Measure::share,
                                           ObjectReader::positive(Measure::share));
    if (share) error.relative = *share;
    return;
  }
  const auto value = core::read_quantity(context, node, pointer, Measure::concentration,
                                         ObjectReader::positive(Measure::concentration));
  if (value) error.absolute = 1000.0 * *value;
}

ErrorModel read_error(ObjectReader& reader) {
  ErrorModel error;
  const core::Json* node = reader.raw("error");
  if (node == nullptr) {
    reader.fault(
        "error", "no measurement error", "the fit weighs every sample by its standard deviation",
        "Add \"error\": \"3 %\", \"0.1 g/m3\" or both as a list; the laboratory knows it.");
    error.relative = 0.05;
    return error;
  }
  if (!node->is_array()) {
    add_error_part(reader.context(), *node, reader.pointer_to("error"), error);
    return error;
  }
  for (std::size_t i = 0; i < node->size(); ++i) {
    add_error_part(reader.context(), (*node)[i],
                   fmt::format("{}/{}", reader.pointer_to("error"), i), error);
  }
  return error;
}

/// Reads cells into samples.
class RowReader {
 public:
  RowReader(const core::CsvTable& table, core::FaultList& faults)
      : table_(table), faults_(faults) {}

  /// Times in days of model time; dates against the clock's epoch.
  struct TimeColumn {
    Column column;
    std::optional<DateOrder> dates;
    double epoch = 0.0;
  };

  std::optional<double> time(std::size_t row, const TimeColumn& column) {
    if (!column.dates) {
      const auto number = table_.number(row, column.column.number, faults_);
      if (!number) return std::nullopt;
      return *number * column.column.scale.scale + column.column.scale.offset;
    }
    const std::string_view cell = table_.cell(row, column.column.number);
    if (cell.empty()) return std::nullopt;
    const auto days = read_date_time(cell, *column.dates);
    if (!days) {
      faults_.add({.file = table_.name(),
                   .pointer = "column " + table_.header()[column.column.number],
                   .line = table_.line(row),
                   .found = fmt::format("\"{}\"", cell),
                   .allowed = "a date and time such as 2026-03-02 14:30",
                   .way_out = "Write the date in the order that \"dates\" states."});
      return std::nullopt;
    }
    return *days - column.epoch;
  }

  /// A value, or the limit of a cell like "<0.02".
  struct Value {
    double value = 0.0;
    bool censored = false;
  };
  std::optional<Value> value(std::size_t row, const Column& column) {
    std::string_view cell = table_.cell(row, column.number);
    if (!cell.empty() && cell.front() == '<') {
      cell.remove_prefix(1);
      std::string number(cell);
      std::replace(number.begin(), number.end(), ',', '.');
      char* end = nullptr;
      const double limit = std::strtod(number.c_str(), &end);
      if (end != number.c_str() && limit > 0.0) return Value{limit * column.scale.scale, true};
    }
    const auto number = table_.number(row, column.number, faults_);
    if (!number) return std::nullopt;
    return Value{*number * column.scale.scale + column.scale.offset, false};
  }

 private:
  const core::CsvTable& table_;
  core::FaultList& faults_;
};

void order_and_merge(SamplingPoint& point) {
  auto& samples = point.samples;
  const auto earlier = [](const TracerSample& a, const TracerSample& b) { return a.time < b.time; };
  if (!std::is_sorted(samples.begin(), samples.end(), earlier)) {
    std::stable_sort(samples.begin(), samples.end(), earlier);
    point.notes.push_back(point.csv + ": rows were not in time order; sorted");
  }
  std::vector<TracerSample> merged;
  std::vector<int> counts;
  for (const TracerSample& sample : samples) {
    if (merged.empty() || sample.time - merged.back().time > 1e-9) {
      merged.push_back(sample);
      counts.push_back(1);
      continue;
    }
    TracerSample& kept = merged.back();
    const int n = counts.back()++;
    point.notes.push_back(fmt::format("{}: lines {} and {} have the same time; averaged", point.csv,
                                      kept.line, sample.line));
    if (kept.censored != sample.censored) {
      if (kept.censored) kept = sample;  // a number says more than a limit
      continue;
    }
    kept.value = (n * kept.value + sample.value) / (n + 1);
    kept.error = sample.error / std::sqrt(static_cast<double>(n + 1));
  }
  samples = std::move(merged);
}

struct PointColumns {
  RowReader::TimeColumn time;
  Column value;
};

std::optional<PointColumns> read_columns(ObjectReader& reader, const TestClock& clock,
                                         const core::CsvTable& table) {
  PointColumns columns;
  bool fine = true;
  if (auto time = reader.object("time", Need::required)) {
    const auto number = find_column(*time, table);
    if (time->has("dates")) {
      static const std::array<std::string, 3> kOrders = {"year first", "day first", "month first"};
      const auto order = time->word("dates", kOrders, Need::required);
      if (order) columns.time.dates = date_order_of(*order);
      columns.time.epoch = clock.epoch();
      if (!clock.dated()) {
        time->fault("dates", "dates", "the dose's \"at\" must then be a date too",
                    "Write \"at\": \"2026-03-02 08:00\" in \"dose\".");
      }
      fine = fine && number && order && clock.dated();
    } else {
      const auto scale = read_scale(*time, Measure::duration);
      if (scale) columns.time.column.scale = *scale;
      fine = fine && number && scale;
    }
    if (number) columns.time.column.number = *number;
    time->finish();
  } else {
    fine = false;
  }
  if (auto value = reader.object("value", Need::required)) {
    const auto number = find_column(*value, table);
    const auto scale = read_scale(*value, Measure::concentration);
    if (number) columns.value.number = *number;
    if (scale) columns.value.scale = {1000.0 * scale->scale, 1000.0 * scale->offset};
    fine = fine && number && scale;
    value->finish();
  } else {
    fine = false;
  }
  if (!fine) return std::nullopt;
  return columns;
}

void read_rows(const core::CsvTable& table, const PointColumns& columns, const ErrorModel& error,
               double dose_at, core::FaultList& faults, SamplingPoint& point) {
  RowReader rows(table, faults);
  int n_missing = 0;
  for (std::size_t row = 0; row < table.n_rows(); ++row) {
    const auto time = rows.time(row, columns.time);
    const auto value = rows.value(row, columns.value);
    if (!time || !value) {
      ++n_missing;
      continue;
    }
    TracerSample sample{.time = *time,
                        .value = value->value,
                        .error = 0.0,
                        .censored = value->censored,
                        .line = table.line(row)};
    if (!sample.censored && sample.value < point.detection_limit) {
      sample.censored = true;
      sample.value = point.detection_limit;
    }
    sample.error = error.at(std::max(sample.value, point.detection_limit));
    (sample.time < dose_at ? point.before : point.samples).push_back(sample);
  }
  if (n_missing > 0) {
    point.notes.push_back(fmt::format("{}: {} of {} rows have no time or no value; left out",
                                      point.csv, n_missing, table.n_rows()));
  }
}

}  // namespace

std::optional<double> TestClock::read_start(ObjectReader& dose) {
  const core::Json* node = dose.raw("at");
  if (node == nullptr) return 0.0;
  if (node->is_string()) {
    const auto days = read_date_time(node->get<std::string>(), DateOrder::year_first);
    if (days) {
      dated_ = true;
      epoch_ = *days;
      return 0.0;
    }
  }
  const auto at = dose.quantity<Measure::duration>("at", Need::required, {});
  if (!at) return std::nullopt;
  return at->value();
}

std::optional<SamplingPoint> read_sampling_point(ObjectReader& reader, const TestClock& clock,
                                                 const TracerTest& test) {
  SamplingPoint point;
  point.at = reader.text("at", Need::optional).value_or("outlet");
  const auto csv = reader.text("csv", Need::required);
  const ErrorModel error = read_error(reader);
  const auto limit = reader.quantity<Measure::concentration>(
      "detection_limit", Need::optional, ObjectReader::not_negative(Measure::concentration));
  if (limit) point.detection_limit = 1000.0 * limit->value();
  if (!csv) return std::nullopt;
  point.csv = *csv;
  core::FaultList& faults = reader.context().faults;
  const std::size_t n_before = faults.all().size();
  const auto table = core::CsvTable::read(reader.context().document.folder() / *csv, faults);
  if (!table) {
    (void)reader.raw("time");
    (void)reader.raw("value");
    return std::nullopt;
  }
  const auto columns = read_columns(reader, clock, *table);
  if (!columns) return std::nullopt;
  read_rows(*table, *columns, error, test.dose_at, faults, point);
  order_and_merge(point);
  if (faults.all().size() > n_before) return std::nullopt;
  if (point.samples.empty()) {
    reader.fault("csv", "\"" + *csv + "\"", "no sample was taken after the dose",
                 "Check the time column, its unit and the dose's \"at\".");
    return std::nullopt;
  }
  return point;
}

}  // namespace stillzone::network
