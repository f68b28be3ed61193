#include "cli/report/history_figures.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "cli/report/page.hpp"
#include "cli/report/svg_chart.hpp"

namespace stillzone::cli {

namespace {

constexpr std::size_t kMostPoints = 40000;  // of all curves of a page
constexpr std::size_t kMostBuckets = 480;   // about one per drawing unit
constexpr std::size_t kLeastBuckets = 40;

std::string curve_name(const HistoryChart& chart, const network::Series::Column& column) {
  return chart.by_quantity ? column.place + " " + column.quantity : column.place;
}

std::string number(double value) { return fmt::format("{:.5g}", value); }

/// The whole history, one row per time.
std::string whole_csv(const network::Series& series, const HistoryChart& chart) {
  std::vector<std::string> head{"time_d"};
  std::vector<std::vector<std::string>> rows(series.time.size());
  for (std::size_t i = 0; i < rows.size(); ++i)
    rows[i].push_back(fmt::format("{:.7g}", series.time[i]));
  for (const std::size_t c : chart.columns) {
    const auto& column = series.columns[c];
    head.push_back(fmt::format("{} [{}]", curve_name(chart, column), column.unit));
    for (std::size_t i = 0; i < rows.size(); ++i) rows[i].push_back(number(column.values[i]));
  }
  return csv_of(head, rows);
}

/// Lowest and highest of each stretch of time.
std::string envelope_csv(const network::Series& series, const HistoryChart& chart,
                         std::size_t n_buckets) {
  std::vector<std::string> head{"from_d", "until_d"};
  for (const std::size_t c : chart.columns) {
    const auto& column = series.columns[c];
    const std::string name = curve_name(chart, column);
    head.push_back(fmt::format("{} lowest [{}]", name, column.unit));
    head.push_back(fmt::format("{} highest [{}]", name, column.unit));
  }
  std::vector<std::vector<std::string>> rows;
  const std::size_t n = series.time.size();
  for (std::size_t b = 0; b < n_buckets; ++b) {
    const std::size_t from = b * n / n_buckets;
    const std::size_t until = (b + 1) * n / n_buckets;
    if (until <= from) continue;
    rows.push_back(
        {fmt::format("{:.6g}", series.time[from]), fmt::format("{:.6g}", series.time[until - 1])});
    for (const std::size_t c : chart.columns) {
      const auto first = series.columns[c].values.begin();
      const auto [low, high] = std::minmax_element(first + static_cast<std::ptrdiff_t>(from),
                                                   first + static_cast<std::ptrdiff_t>(until));
      rows.back().push_back(number(*low));
      rows.back().push_back(number(*high));
    }
  }
  return csv_of(head, rows);
}

}  // namespace

std::string history_figures(const network::Series& series, std::span<const HistoryChart> charts) {
  std::size_t n_curves = 0;
  for (const HistoryChart& chart : charts) n_curves += chart.columns.size();
  if (series.time.size() < 2 || n_curves == 0) return "";
  const std::size_t n_buckets =
      std::clamp(kMostPoints / (4 * n_curves), kLeastBuckets, kMostBuckets);
  const bool whole = series.time.size() <= 4 * n_buckets;
  std::string html = "<div class=charts>";
  for (const HistoryChart& chart : charts) {
    if (chart.columns.empty()) continue;
    Chart drawn;
    drawn.title = chart.title + " over time";
    drawn.x = {.title = "time", .unit = "d", .logarithmic = false, .low = {}, .high = {}};
    drawn.y = {.title = chart.title,
               .unit = chart.unit == "1" ? "" : chart.unit,
               .logarithmic = false,
               .low = {},
               .high = {}};
    drawn.zoom = true;
    for (std::size_t i = 0; i < chart.columns.size(); ++i) {
      const auto& column = series.columns[chart.columns[i]];
      ChartSeries curve;
      curve.name = curve_name(chart, column);
      curve.points = decimated(series.time, column.values, n_buckets);
      curve.style = i;
      drawn.series.push_back(std::move(curve));
    }
    html += html_figure(chart.name, svg_of(drawn), "<b>" + html_escaped(chart.title) + "</b>",
                        whole ? whole_csv(series, chart) : envelope_csv(series, chart, n_buckets));
  }
  html += "</div><p class=note>Time counts from the start of the run. ";
  html += whole ? "Every recorded value is drawn."
                : fmt::format(
                      "The {} recorded times are drawn as {} stretches, each with its "
                      "first, lowest, highest and last value; the CSV of a figure holds "
                      "lowest and highest. The file series.csv beside this page holds "
                      "every record.",
                      series.time.size(), n_buckets);
  return html + " <span class=screen>Drag across a chart to zoom.</span></p>\n";
}

}  // namespace stillzone::cli
