#include "network/tracer/sample_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <charconv>
#include <cmath>
#include <utility>
#include <vector>

#include "core/csv_table.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

/// One part of "error": "0.10 g/m3" or "3 %".
void add_error_part(ObjectReader& reader, const core::Json& node, const std::string& pointer,
                    ErrorModel& error) {
  if (node.is_number()) {
    const core::JsonDocument& document = reader.context().document;
    const std::string number = core::shown(node);
    reader.context().faults.add(
        {.file = document.name(),
         .pointer = pointer,
         .line = document.line_of(pointer),
         .found = number,
         .allowed = "an error is a share or a concentration",
         .way_out = fmt::format("Write \"{0} %\" or \"{0} g/m3\", whichever is meant.", number)});
    return;
  }
  const std::string text = node.is_string() ? node.get<std::string>() : std::string();
  const bool is_share = text.find('%') != std::string::npos;
  double& part = is_share ? error.relative : error.absolute;
  const Measure measure = is_share ? Measure::share : Measure::concentration;
  const auto value = core::read_quantity(reader.context(), node, pointer, measure,
                                         ObjectReader::positive(measure));
  if (!value) return;
  if (part > 0.0) {
    reader.fault("error", is_share ? "two shares" : "two concentrations",
                 "an error has one share and one concentration at most", "Take one of them out.");
  }
  part = is_share ? *value : 1000.0 * *value;
}

/// "<0.02", "< 0,02" -> 0.02.
std::optional<double> written_limit(std::string_view cell) {
  cell.remove_prefix(1);
  while (!cell.empty() && (cell.front() == ' ' || cell.front() == '=')) cell.remove_prefix(1);
  std::string text(cell);
  std::replace(text.begin(), text.end(), ',', '.');
  double limit = 0.0;
  const auto read = std::from_chars(text.data(), text.data() + text.size(), limit);
  if (read.ec != std::errc() || read.ptr != text.data() + text.size()) return std::nullopt;
  if (!(limit > 0.0) || !std::isfinite(limit)) return std::nullopt;
  return limit;
}

/// "nd", "<LOD", ...: under the limit, which the cell does not state.
bool says_not_detected(std::string_view cell) {
  std::string word;
  for (const char c : cell) {
    if (std::isalpha(static_cast<unsigned char>(c)) != 0) {
      word += static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
    } else if (c != '<' && c != '.' && c != ' ') {
      return false;
    }
  }
  static constexpr std::array<std::string_view, 8> kWords = {"nd",  "bdl", "lod", "loq",
                                                             "mdl", "dl",  "bql", "notdetected"};
  return std::find(kWords.begin(), kWords.end(), word) != kWords.end();
}

/// A value [g/m3], or the limit it lies under.
struct SampleValue {
  double value = 0.0;
  bool censored = false;
};

/// Reads the value cell of a row; empty when it is missing or a fault.
std::optional<SampleValue> read_value(CellReader& cells, const core::CsvTable& table,
                                      std::size_t row, const ValueColumn& column,
                                      double detection_limit) {
  const double to_g_m3 = 1000.0 * column.scale.scale;  // the internal unit is kg/m3
  const std::string_view cell = table.cell(row, column.number);
  if (says_not_detected(cell)) {
    if (detection_limit > 0.0) return SampleValue{detection_limit, true};
    cells.refuse(row, column.number, "a sample under the limit needs the limit",
                 "Add \"detection_limit\", or write the cell like <0.02.");
    return std::nullopt;
  }
  if (!cell.empty() && cell.front() == '<') {
    if (const auto limit = written_limit(cell)) return SampleValue{*limit * to_g_m3, true};
    cells.refuse(row, column.number, "a value under its limit is written like <0.02",
                 "Write the limit as a number > 0 in the unit of the column.");
    return std::nullopt;
  }
  if (!cell.empty() && cell.front() == '>') {
    cells.refuse(row, column.number, "a value over the range of the instrument is no measurement",
                 "Have the sample diluted and measured again, or leave the cell empty.");
    return std::nullopt;
  }
  const auto number = cells.number(row, column.number);
  if (!number) return std::nullopt;
  const double value = *number * to_g_m3 + 1000.0 * column.scale.offset;
  if (detection_limit > 0.0 && value < detection_limit) return SampleValue{detection_limit, true};
  return SampleValue{value, false};
}

/// One sample out of several of the same time.
TracerSample averaged(std::vector<TracerSample>::const_iterator first,
                      std::vector<TracerSample>::const_iterator last) {
  TracerSample result = *first;
  double sum = 0.0;
  double squares = 0.0;
  int n = 0;
  for (auto sample = first; sample != last; ++sample) {
    if (sample->censored) {
      if (result.censored && sample->value < result.value) result = *sample;
      continue;
    }
    if (n == 0) result = *sample;
    sum += sample->value;
    squares += sample->error * sample->error;
    ++n;
  }
  if (n > 0) {
    result.value = sum / n;
    result.error = std::sqrt(squares) / n;
    result.n_averaged = n;
  }
  return result;
}

/// Sorts by time and makes one sample of several of the same time.
void order_and_merge(std::vector<TracerSample>& samples, SamplingPoint& point) {
  constexpr double kSameTime = 1e-8;  // [d], a millisecond: dates carry rounding
  constexpr std::size_t kMostShown = 4;
  const auto earlier = [](const TracerSample& a, const TracerSample& b) { return a.time < b.time; };
  if (!std::is_sorted(samples.begin(), samples.end(), earlier)) {
    std::stable_sort(samples.begin(), samples.end(), earlier);
    point.notes.push_back(point.csv + ": rows were not in time order; sorted");
  }
  std::vector<TracerSample> merged;
  std::vector<std::string> repeated;
  for (auto first = samples.cbegin(); first != samples.cend();) {
    auto last = first + 1;
    while (last != samples.cend() && last->time - first->time <= kSameTime) ++last;
    merged.push_back(averaged(first, last));
    if (last - first > 1) {
      std::string lines = fmt::format("{}", first->line);
      for (auto sample = first + 1; sample != last; ++sample) {
        lines += fmt::format("{}{}", sample + 1 == last ? " and " : ", ", sample->line);
      }
      repeated.push_back(std::move(lines));
    }
    first = last;
  }
  for (std::size_t i = 0; i < std::min(repeated.size(), kMostShown); ++i) {
    point.notes.push_back(
        fmt::format("{}: lines {} have the same time; averaged", point.csv, repeated[i]));
  }
  if (repeated.size() > kMostShown) {
    point.notes.push_back(fmt::format("{}: {} more times stand more than once; averaged", point.csv,
                                      repeated.size() - kMostShown));
  }
  samples = std::move(merged);
}

/// Gives every sample its error; a share alone is taken of a floor at least.
void set_errors(std::vector<TracerSample>& samples, const ErrorModel& error, ObjectReader& reader,
                SamplingPoint& point) {
  double floor = 0.0;
  if (error.absolute <= 0.0) {
    double largest = 0.0;
    for (const TracerSample& sample : samples) largest = std::max(largest, sample.value);
    floor = point.detection_limit > 0.0 ? point.detection_limit : 0.01 * largest;
    if (!(floor > 0.0)) {
      reader.fault("error", core::shown(*reader.raw("error")), "no sample of this table is above 0",
                   "Check the value column, or add an absolute part to \"error\".");
      return;
    }
  }
  std::size_t n_raised = 0;
  std::size_t n_negative = 0;
  std::size_t n_far_below = 0;
  for (TracerSample& sample : samples) {
    sample.error = error.at(std::max(sample.value, floor));
    n_raised += sample.value < floor ? 1U : 0U;
    n_negative += sample.value < 0.0 ? 1U : 0U;
    n_far_below += sample.value < -3.0 * sample.error ? 1U : 0U;
  }
  if (n_raised > 0 && error.absolute <= 0.0 && point.detection_limit <= 0.0) {
    point.notes.push_back(fmt::format(
        "{}: the error is a share alone; for {} small value{} it is taken of 1 % of the largest "
        "value. State an absolute part or the detection limit too",
        point.csv, n_raised, n_raised == 1 ? "" : "s"));
  }
  if (n_negative > 0) {
    point.notes.push_back(fmt::format(
        "{}: {} value{} below zero, kept as measured{}", point.csv, n_negative,
        n_negative == 1 ? "" : "s",
        n_far_below > 0
            ? fmt::format("; {} by more than three errors: check the blank", n_far_below)
            : ""));
  }
}

std::vector<TracerSample> read_rows(const core::CsvTable& table, const TimeAndValue& columns,
                                    core::FaultList& faults, SamplingPoint& point) {
  CellReader cells(table);
  std::vector<TracerSample> samples;
  for (std::size_t row = 0; row < table.n_rows(); ++row) {
    const auto time = cells.time(row, columns.time);
    const auto value = read_value(cells, table, row, columns.value, point.detection_limit);
    if (!time || !value) continue;
    samples.push_back({.time = *time,
                       .value = value->value,
                       .error = 0.0,
                       .censored = value->censored,
                       .line = table.line(row)});
  }
  if (!cells.finish(faults)) return samples;
  if (samples.size() < table.n_rows()) {
    point.notes.push_back(fmt::format("{}: {} of {} rows have no time or no value; left out",
                                      point.csv, table.n_rows() - samples.size(), table.n_rows()));
  }
  return samples;
}

/// The samples of a table, cleaned, into the point. Faults when nothing usable is left.
void read_samples(ObjectReader& reader, const core::CsvTable& table, const TimeAndValue& columns,
                  const ErrorModel& error, double dose_at, SamplingPoint& point) {
  core::FaultList& faults = reader.context().faults;
  const std::size_t n_before = faults.all().size();
  std::vector<TracerSample> samples = read_rows(table, columns, faults, point);
  if (faults.all().size() > n_before) return;
  if (samples.empty()) {
    reader.fault("csv", "\"" + point.csv + "\"", "no row has both a time and a value",
                 "Check the columns.");
    return;
  }
  const auto first = std::min_element(
      samples.begin(), samples.end(),
      [](const TracerSample& a, const TracerSample& b) { return a.time < b.time; });
  if (!plausible_first_time(first->time, first->line, columns.time, dose_at, table, faults)) return;
  set_errors(samples, error, reader, point);
  order_and_merge(samples, point);
  for (const TracerSample& sample : samples) {
    (sample.time < dose_at ? point.before : point.samples).push_back(sample);
  }
  if (point.samples.empty()) {
    reader.fault("csv",
                 fmt::format("\"{}\", {} samples, the last {:.3g} d before the dose", point.csv,
                             samples.size(), dose_at - samples.back().time),
                 "no sample was taken after the dose",
                 "Check the time column, its unit and the dose's \"at\".");
  }
}

}  // namespace

ErrorModel read_error(ObjectReader& reader) {
  ErrorModel error;
  const core::Json* node = reader.raw("error");
  if (node == nullptr || (node->is_array() && node->empty())) {
    reader.fault(
        node == nullptr ? "" : "error", node == nullptr ? "no \"error\"" : "an empty list",
        "the fit weighs every sample by its standard deviation",
        "Add \"error\": \"3 %\", \"0.1 g/m3\" or both as a list; the laboratory knows it.");
    return error;
  }
  if (!node->is_array()) {
    add_error_part(reader, *node, reader.pointer_to("error"), error);
    return error;
  }
  for (std::size_t i = 0; i < node->size(); ++i) {
    add_error_part(reader, (*node)[i], fmt::format("{}/{}", reader.pointer_to("error"), i), error);
  }
  return error;
}

std::optional<SamplingPoint> read_sampling_point(ObjectReader& reader, const TestClock& clock,
                                                 const TracerTest& test) {
  core::FaultList& faults = reader.context().faults;
  const std::size_t n_before = faults.all().size();
  SamplingPoint point;
  point.at = reader.text("at", Need::optional).value_or("outlet");
  const auto csv = reader.text("csv", Need::required);
  const ErrorModel error = read_error(reader);
  point.error_absolute = error.absolute;
  point.error_relative = error.relative;
  const auto limit = reader.quantity<Measure::concentration>(
      "detection_limit", Need::optional, ObjectReader::not_negative(Measure::concentration));
  if (limit) point.detection_limit = 1000.0 * limit->value();
  const auto table =
      csv ? core::CsvTable::read(reader.context().document.folder() / *csv, faults) : std::nullopt;
  if (!table) {
    (void)reader.raw("time");
    (void)reader.raw("value");
    return std::nullopt;
  }
  point.csv = *csv;
  const auto columns = read_time_and_value(reader, clock, *table, Measure::concentration);
  if (!columns) return std::nullopt;
  if (clock.dated() && !columns->time.dates) {
    point.notes.push_back(point.csv + ": its elapsed times are counted from the dose");
  }
  read_samples(reader, *table, *columns, error, test.dose_at, point);
  if (faults.all().size() > n_before) return std::nullopt;
  return point;
}

}  // namespace stillzone::network
