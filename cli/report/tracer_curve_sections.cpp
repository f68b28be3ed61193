// Samples and fits over time, and what the fits leave over.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>
#include <cmath>
#include <limits>

#include "cli/report/page.hpp"
#include "cli/report/svg_chart.hpp"
#include "cli/report/tracer_sections.hpp"

namespace stillzone::cli {

namespace {

using network::RankedModel;
using network::TracerSample;
using network::TracerTest;

constexpr std::size_t kSampleStyle = 5;
constexpr std::size_t kLimitStyle = 4;
constexpr std::size_t kBeforeStyle = 3;
constexpr int kGrid = 240;

double background_at(const TracerTest& test, double time) {
  return test.background.level + test.background.slope * (time - test.dose_at);
}

/// Name of a figure and its CSV: lower-case letters, figures and hyphens only, one per point.
std::string figure_name(const std::string& what, const TracerTest& test, std::size_t p) {
  std::string name = what + "-";
  for (const char c : test.points[p].at) {
    name += std::isalnum(static_cast<unsigned char>(c)) != 0 ? c : '-';
  }
  return p == 0 ? name : fmt::format("{}-{}", name, p + 1);
}

std::size_t n_shown(const TracerReportInput& input) {
  return std::min(kModelsShown, input.analysis.models.size());
}

double last_time(const TracerTest& test) {
  double last = test.dose_at;
  for (const auto& point : test.points) {
    if (!point.samples.empty()) last = std::max(last, point.samples.back().time);
  }
  return last;
}

/// Times [d] of a fitted curve: dense after the dose, where the curve bends, and on past the last
/// sample by a quarter of the test.
std::vector<double> curve_times(const TracerTest& test) {
  const double length = 1.25 * (last_time(test) - test.dose_at);
  std::vector<double> times;
  for (int i = 0; i <= kGrid; ++i) {
    const double share = static_cast<double>(i) / kGrid;
    times.push_back(test.dose_at + length * share * share);
  }
  if (const auto* pulse = std::get_if<network::PulseDose>(&test.dose)) {
    times.push_back(test.dose_at + pulse->duration);
    times.push_back(test.dose_at + pulse->duration * 1.0001 + 1e-9 * length);
  }
  std::ranges::sort(times);
  const auto repeated = std::ranges::unique(times);
  times.erase(repeated.begin(), repeated.end());
  return times;
}

ChartSeries fitted_curve(const TracerTest& test, const RankedModel& ranked, std::size_t point,
                         std::size_t rank) {
  ChartSeries series;
  series.name = ranked.fit.name;
  series.style = rank;
  series.bare = true;
  const std::vector<double> times = curve_times(test);
  std::vector<network::SamplePosition> positions;
  for (const double t : times) positions.push_back({point, test.turnovers(t)});
  std::vector<double> values(times.size());
  if (!ranked.model->predict(ranked.fit.model_values(), positions, values, {})) return series;
  const double recovered = ranked.fit.recovered_fraction();
  for (std::size_t i = 0; i < times.size(); ++i) {
    if (std::isfinite(values[i])) series.points.push_back({times[i], recovered * values[i]});
  }
  return series;
}

ChartSeries sample_series(const TracerTest& test, const std::vector<TracerSample>& samples,
                          const char* name, std::size_t style, bool censored) {
  ChartSeries series;
  series.name = name;
  series.kind = ChartSeries::Kind::points;
  series.style = style;
  series.upper_limits = censored;
  for (const TracerSample& sample : samples) {
    if (sample.censored != censored) continue;
    const double net = sample.value - background_at(test, sample.time);
    series.points.push_back({sample.time, net});
    series.low.push_back(censored ? std::min(net, 0.0) : net - sample.error);
    series.high.push_back(censored ? net : net + sample.error);
  }
  return series;
}

/// Highest sample with its error bar, net [g/m3]; 0 without any above 0.
double highest_sample(const Chart& chart) {
  double highest = 0.0;
  for (const ChartSeries& series : chart.series) {
    for (const double high : series.high) highest = std::max(highest, high);
  }
  return highest;
}

/// A fitted bypass peaks far above every sample while the dose lasts: the scale goes by the samples
/// then, and the curve runs off the top.
bool cut_off_peaks(Chart& chart) {
  const double highest = highest_sample(chart);
  if (!(highest > 0.0)) return false;
  double peak = 0.0;
  for (const ChartSeries& series : chart.series) {
    if (series.kind != ChartSeries::Kind::line) continue;
    for (const ChartPoint& point : series.points) peak = std::max(peak, point.y);
  }
  if (peak < 1.6 * highest) return false;
  chart.y.high = 1.25 * highest;
  return true;
}

Chart curve_chart(const TracerReportInput& input, std::size_t p) {
  const TracerTest& test = input.test;
  const auto& point = test.points[p];
  Chart chart;
  chart.title = fmt::format("Tracer at {}, background taken off", point.at);
  chart.x = {"time", "d", false, {}, {}};
  chart.y = {test.tracer.empty() ? "tracer" : test.tracer, "g/m\u00B3", false, {}, {}};
  for (std::size_t m = 0; m < n_shown(input); ++m) {
    chart.series.push_back(fitted_curve(test, input.analysis.models[m], p, m));
  }
  const auto add = [&](ChartSeries series) {
    if (!series.points.empty()) chart.series.push_back(std::move(series));
  };
  add(sample_series(test, point.samples, "samples", kSampleStyle, false));
  add(sample_series(test, point.samples, "under detection limit", kLimitStyle, true));
  add(sample_series(test, point.before, "before the dose", kBeforeStyle, false));
  chart.marks.push_back({test.dose_at, "dose"});
  const double last = last_time(test);
  if (n_shown(input) > 0 && last > test.dose_at) chart.marks.push_back({last, "last sample"});
  return chart;
}

/// What a curve still lacks of the step: its own level less the curve.
void turn_to_missing(const TracerReportInput& input, double concentration, Chart& chart) {
  const auto& models = input.analysis.models;
  const double seen = models.empty() ? 1.0 : models.front().fit.recovered_fraction();
  for (std::size_t s = 0; s < chart.series.size(); ++s) {
    ChartSeries& series = chart.series[s];
    const bool is_fit = series.kind == ChartSeries::Kind::line;
    const double level =
        concentration * (is_fit ? models[series.style].fit.recovered_fraction() : seen);
    for (ChartPoint& point : series.points) point.y = level - point.y;
    for (double& low : series.low) low = level - low;
    for (double& high : series.high) high = level - high;
    std::swap(series.low, series.high);
    series.upper_limits = false;
  }
  chart.title = "Tracer still missing of the step";
  chart.y.title = "missing of the step";
}

/// The same on a logarithmic scale: from half of the lowest positive sample or limit up, of a step
/// what is still missing from it, down to the error of a sample.
std::optional<Chart> logarithmic(const TracerReportInput& input, Chart chart) {
  std::erase_if(chart.series,
                [](const ChartSeries& series) { return series.name == "before the dose"; });
  double lowest = std::numeric_limits<double>::infinity();
  if (const auto* step = std::get_if<network::StepDose>(&input.test.dose)) {
    turn_to_missing(input, step->concentration, chart);
  }
  for (const ChartSeries& series : chart.series) {
    if (series.kind != ChartSeries::Kind::points) continue;
    for (std::size_t i = 0; i < series.points.size(); ++i) {
      const double error = 0.5 * (series.high[i] - series.low[i]);
      const double y = std::max(series.points[i].y, error);
      if (y > 0.0) lowest = std::min(lowest, y);
    }
  }
  if (!std::isfinite(lowest)) return std::nullopt;
  const double floor = 0.5 * lowest;
  chart.y.logarithmic = true;
  chart.y.low = floor;
  for (ChartSeries& series : chart.series) {
    const auto below = [&](const ChartPoint& point) { return point.y < floor; };
    if (series.kind == ChartSeries::Kind::line) std::erase_if(series.points, below);
    for (double& low : series.low) low = std::max(low, floor);
    for (double& high : series.high) high = std::max(high, floor);
    for (ChartPoint& point : series.points) {
      if (point.y < floor) point.y = 0.0;  // left out by the scale
    }
  }
  return chart;
}

std::string logarithmic_words(const TracerTest& test) {
  std::string words = std::holds_alternative<network::StepDose>(test.dose)
                          ? "<b>What is still missing of the step, on a logarithmic scale</b>"
                          : "<b>The same on a logarithmic scale</b>";
  words +=
      ": one mixed tank falls along a straight line; a bend to a slower fall is water that stood "
      "still. What lies below the scale is not drawn.";
  if (test.flow_record) {
    words +=
        " The flow varied, so that even one mixed tank does not fall along a quite straight line.";
  }
  return words;
}

std::string censored_words(const network::SamplingPoint& point) {
  const auto n = std::ranges::count_if(point.samples, &TracerSample::censored);
  if (n == 0) return "";
  return fmt::format(
      " {} of {} samples lie under the detection limit: the mark stands at the limit, and the bar "
      "below it says that the value may be anything from there down.",
      n, point.samples.size());
}

/// Every sample beside every model drawn, as CSV.
std::string residuals_csv(const TracerReportInput& input, std::size_t p) {
  std::vector<std::vector<std::string>> rows;
  for (std::size_t m = 0; m < n_shown(input); ++m) {
    const auto& fit = input.analysis.models[m].fit;
    for (const network::FittedSample& s : fit.samples) {
      if (s.point != p) continue;
      rows.push_back({fit.name, fmt::format("{:.6g}", s.time), s.censored ? "yes" : "no",
                      fmt::format("{:.6g}", s.measured), fmt::format("{:.6g}", s.fitted),
                      fmt::format("{:.6g}", s.deviation), fmt::format("{:.6g}", s.residual),
                      fmt::format("{:.4g}", s.weight)});
    }
  }
  return csv_of({"model", "time [d]", "under the limit", "measured, net [g/m3]",
                 "fitted, net [g/m3]", "error in the fit [g/m3]", "residual", "weight"},
                rows);
}

/// Residuals of the quantified samples against time or fitted value; the best model lies on top.
Chart residual_chart(const TracerReportInput& input, std::size_t p, bool against_time) {
  Chart chart;
  chart.title = "Residuals at " + input.test.points[p].at;
  chart.x = against_time ? ChartAxis{"time", "d", false, {}, {}}
                         : ChartAxis{"fitted value", "g/m\u00B3", true, {}, {}};
  chart.y = {"(fitted \u2212 measured) / error", "", false, {}, {}};
  double from = std::numeric_limits<double>::infinity();
  double to = -from;
  for (std::size_t m = n_shown(input); m-- > 0;) {
    ChartSeries series;
    series.name = input.analysis.models[m].fit.name;
    series.kind = ChartSeries::Kind::points;
    series.style = m;
    for (const network::FittedSample& s : input.analysis.models[m].fit.samples) {
      const double x = against_time ? s.time : s.fitted;
      if (s.point != p || s.censored || (!against_time && !(x > 0.0))) continue;
      series.points.push_back({x, s.residual});
      from = std::min(from, x);
      to = std::max(to, x);
    }
    chart.series.push_back(std::move(series));
  }
  if (!(from < to)) return chart;
  ChartSeries band;
  band.name = "within 2 errors";
  band.kind = ChartSeries::Kind::band;
  band.points = {{from, 0.0}, {to, 0.0}};
  band.low = {-2.0, -2.0};
  band.high = {2.0, 2.0};
  band.style = 7;
  chart.series.push_back(std::move(band));
  return chart;
}

/// A chance as %, "< 0.01" where it is as good as none.
std::string chance(double p) { return p < 1e-4 ? "< 0.01" : shown(100.0 * p, 2); }

std::string residual_figures(const TracerReportInput& input, std::size_t p) {
  const std::string& at = input.test.points[p].at;
  const std::string csv = residuals_csv(input, p);
  std::string html = html_figure(
      figure_name("residuals", input.test, p), svg_of(residual_chart(input, p, true)),
      fmt::format("<b>Residuals at {}</b> in units of the error each sample has in the fit; above "
                  "0 the fit lies higher than the sample. Long runs on one side say that the curve "
                  "has another shape. Samples under the limit are left out here and are in the "
                  "CSV.",
                  html_escaped(at)),
      csv);
  html += html_figure(figure_name("residuals-by-value", input.test, p),
                      svg_of(residual_chart(input, p, false)),
                      "<b>The same against the fitted value</b>: residuals that widen to one side "
                      "say that the stated error is wrong there.",
                      csv);
  return html;
}

}  // namespace

std::string tracer_curve_section(const TracerReportInput& input) {
  std::string html;
  for (std::size_t p = 0; p < input.test.points.size(); ++p) {
    const auto& point = input.test.points[p];
    Chart chart = curve_chart(input, p);
    const bool cut = cut_off_peaks(chart);
    const std::string caption = fmt::format(
        "<b>Tracer ({}) at {}</b>, background taken off. Bars: one standard deviation, as stated. "
        "{}{}{}",
        html_escaped(input.test.tracer), html_escaped(point.at),
        n_shown(input) > 0 ? "Curves: the best models, drawn on past the last sample." : "",
        cut ? " While the dose lasts a fitted curve runs off the top: a bypass; its peak is in the "
              "CSV."
            : "",
        censored_words(point));
    std::string charts =
        html_figure(figure_name("curve", input.test, p), svg_of(chart), caption, csv_of(chart));
    if (const auto log_chart = logarithmic(input, chart)) {
      charts += html_figure(figure_name("curve-log", input.test, p), svg_of(*log_chart),
                            logarithmic_words(input.test), csv_of(*log_chart));
    }
    html += "<div class=charts>" + charts + "</div>\n";
  }
  return html;
}

std::string tracer_residual_section(const TracerReportInput& input) {
  std::string html = "<div class=charts>";
  for (std::size_t p = 0; p < input.test.points.size(); ++p) {
    html += residual_figures(input, p);
  }
  html += "</div>\n";
  HtmlTable table;
  table.head = {"Model", "Runs of one sign", "Chance of so few\n%", "Chance of such scatter\n%",
                "In words"};
  table.left = {true, false, false, false, true};
  for (std::size_t m = 0; m < n_shown(input); ++m) {
    const auto& fit = input.analysis.models[m].fit;
    std::string words;
    for (const std::string& sentence : fit.tests.words)
      words += (words.empty() ? "" : " ") + sentence;
    table.rows.push_back({fit.name, fit.tests.runs_p ? std::to_string(fit.tests.n_runs) : "n/a",
                          fit.tests.runs_p ? chance(*fit.tests.runs_p) : "too few",
                          chance(fit.tests.scatter_p),
                          words.empty() ? "Nothing against the model." : words});
  }
  return html + html_of(table) +
         "<p class=note>Runs test: Wald and Wolfowitz (1940). A small chance (under 5 %) speaks "
         "against the model, or against the stated errors.</p>\n";
}

}  // namespace stillzone::cli
