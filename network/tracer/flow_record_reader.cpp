#include "network/tracer/flow_record_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <utility>

#include "core/csv_table.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

struct FlowRow {
  double time = 0.0;  ///< [d]
  double flow = 0.0;  ///< [m3/d]
  int line = 0;
};

std::vector<FlowRow> read_rows(const core::CsvTable& table, const TimeAndValue& columns,
                               core::FaultList& faults) {
  CellReader cells(table);
  std::vector<FlowRow> rows;
  for (std::size_t row = 0; row < table.n_rows(); ++row) {
    const auto time = cells.time(row, columns.time);
    const auto number = cells.number(row, columns.value.number);
    if (!time || !number) continue;
    const double flow = *number * columns.value.scale.scale + columns.value.scale.offset;
    if (flow < 0.0) {
      cells.refuse(row, columns.value.number, "the flow through the tank is >= 0",
                   "Leave the cell empty where the meter failed: the flow before holds on.");
    }
    rows.push_back({*time, flow, table.line(row)});
  }
  (void)cells.finish(faults);
  return rows;
}

void refuse_double_times(const std::vector<FlowRow>& rows, const core::CsvTable& table,
                         core::FaultList& faults) {
  for (std::size_t i = 1; i < rows.size(); ++i) {
    if (rows[i].time > rows[i - 1].time) continue;
    faults.add({.file = table.name(),
                .line = std::max(rows[i].line, rows[i - 1].line),
                .found = fmt::format("the time of line {} again",
                                     std::min(rows[i].line, rows[i - 1].line)),
                .allowed = "each time of a flow record stands once",
                .way_out = "Take one of the two rows out."});
    return;  // one shows the way: a column that repeats would fill the screen
  }
}

}  // namespace

std::optional<core::Timeline> read_flow_record(ObjectReader& reader, const TestClock& clock,
                                               double dose_at, std::vector<std::string>& notes) {
  core::FaultList& faults = reader.context().faults;
  const std::size_t n_before = faults.all().size();
  const auto path = reader.text("csv", Need::required);
  const auto table = path ? core::CsvTable::read(reader.context().document.folder() / *path, faults)
                          : std::nullopt;
  if (!table) {
    (void)reader.raw("time");
    (void)reader.raw("value");
    return std::nullopt;
  }
  const auto columns = read_time_and_value(reader, clock, *table, Measure::flow);
  if (!columns) return std::nullopt;
  std::vector<FlowRow> rows = read_rows(*table, *columns, faults);
  if (rows.empty() && faults.all().size() == n_before) {
    reader.fault("csv", "\"" + *path + "\"", "no row has both a time and a flow",
                 "Check the columns.");
  }
  if (faults.all().size() > n_before) return std::nullopt;
  if (rows.size() < table->n_rows()) {
    notes.push_back(fmt::format(
        "{}: {} of {} rows have no time or no flow; the row before holds on in their place", *path,
        table->n_rows() - rows.size(), table->n_rows()));
  }
  const auto earlier = [](const FlowRow& a, const FlowRow& b) { return a.time < b.time; };
  if (!std::is_sorted(rows.begin(), rows.end(), earlier)) {
    notes.push_back(*path + ": rows were not in time order; sorted");
    std::stable_sort(rows.begin(), rows.end(), earlier);
  }
  refuse_double_times(rows, *table, faults);
  (void)plausible_first_time(rows.front().time, rows.front().line, columns->time, dose_at, *table,
                             faults);
  if (faults.all().size() > n_before) return std::nullopt;
  if (clock.dated() && !columns->time.dates) {
    notes.push_back(*path + ": its elapsed times are counted from the dose");
  }
  if (rows.front().time > dose_at) {
    notes.push_back(
        fmt::format("{}: the record starts {:.3g} d after the dose; its first flow is taken before "
                    "that too",
                    *path, rows.front().time - dose_at));
  }
  std::vector<double> times;
  std::vector<double> flows;
  for (const FlowRow& row : rows) {
    times.push_back(row.time);
    flows.push_back(row.flow);
  }
  return core::Timeline::steps(std::move(times), std::move(flows));
}

}  // namespace stillzone::network
