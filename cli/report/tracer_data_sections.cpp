// What the samples say without a model, and what the mixing does to reactions.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/report/page.hpp"
#include "cli/report/tracer_sections.hpp"
#include "cli/report/tracer_words.hpp"

namespace stillzone::cli {

namespace {

using network::RankedModel;
using network::TracerMoments;

std::string known(double value, int digits = 3) {
  return value > 0.0 ? brief(value, digits) : "not known";
}

/// One row per quantity: samples, ideal tank, best model.
HtmlTable moments_table(const TracerMoments& m, const RankedModel* best, bool is_step) {
  const double tau = m.hydraulic_retention_time;
  const auto model = [&](double value) { return best != nullptr ? brief(value, 3) : ""; };
  const double best_mean = best != nullptr ? best->insight.mean : 0.0;
  const double best_t10 = best != nullptr ? best->insight.t10 : 0.0;
  const double best_t90 = best != nullptr ? best->insight.t90 : 0.0;
  HtmlTable table;
  table.head = {"Quantity", "Unit", "Samples", "One ideal tank"};
  table.left = {true, true};
  const double ideal_t10 = -std::log(0.9) * tau;
  const double ideal_t90 = std::log(10.0) * tau;
  table.rows = {
      {"recovery, tail included", "%",
       with_error(100.0 * m.recovery, 100.0 * m.errors.recovery, ""), "100",
       best != nullptr ? brief(100.0 * best->fit.recovered_fraction(), 3) : ""},
      {"mean residence time", "d", with_error(m.mean, m.errors.mean, ""), brief(tau, 3),
       model(best_mean)},
      {"variance", "d\u00B2", with_error(m.variance, m.errors.variance, ""), brief(tau * tau, 3),
       model(best != nullptr ? best->insight.variance : 0.0)},
      {"t10, a tenth has left", "d", with_error(m.t10, m.errors.t10, ""), brief(ideal_t10, 3),
       model(best_t10)},
      {"t50, half has left", "d", with_error(m.t50, m.errors.t50, ""),
       brief(std::log(2.0) * tau, 3), model(best != nullptr ? best->insight.t50 : 0.0)},
      {"t90", "d", with_error(m.t90, m.errors.t90, ""), brief(ideal_t90, 3), model(best_t90)},
      {"Morrill index t90/t10", "", known(m.morrill), brief(ideal_t90 / ideal_t10, 3),
       best != nullptr ? known(best_t10 > 0.0 ? best_t90 / best_t10 : 0.0) : ""},
      {"baffling factor t10/HRT", "", brief(m.baffling, 3), brief(ideal_t10 / tau, 3),
       model(best_t10 / tau)},
      {"active share of the volume, mean/HRT", "%", brief(100.0 * m.active_fraction, 3), "100",
       model(100.0 * best_mean / tau)},
      {"area under the net curve", is_step ? "1" : "g d/m\u00B3", brief(m.area, 4), "", ""},
      {"share beyond the last sample (tail)", "%", brief(100.0 * m.tail.share, 3), "", ""},
      {"share assumed before the first sample", "%", brief(100.0 * m.before_first_sample, 3), "",
       ""}};
  if (best != nullptr) {
    table.head.push_back("Best model\n" + best->fit.name);
  } else {
    for (auto& row : table.rows) row.pop_back();
  }
  return table;
}

std::string moments_of(const TracerReportInput& input, const network::PointResult& point,
                       bool outlet) {
  std::string html;
  if (input.analysis.points.size() > 1) html = "<h3>" + html_escaped(point.at) + "</h3>\n";
  if (!point.moments) {
    return html + fmt::format("<p>No moments: {}</p>\n", html_escaped(point.reason));
  }
  const TracerMoments& m = *point.moments;
  const bool compare = outlet && !input.analysis.models.empty();
  html += html_of(moments_table(m, compare ? &input.analysis.models.front() : nullptr,
                                std::holds_alternative<network::StepDose>(input.test.dose)));
  html += fmt::format("<p>Nominal retention time (HRT) {} d. Integration rule: <b>{}</b>. Tail: {}",
                      brief(m.hydraulic_retention_time, 4),
                      html_escaped(network::rule_name(m.curve.rule())), html_escaped(m.tail.note));
  if (m.tail.rate > 0.0) {
    html += fmt::format(" (rate {})", with_error(m.tail.rate, m.tail.rate_error, "1/d"));
  }
  html += ".</p>\n";
  html += m.errors.n_draws > 0
              ? fmt::format(
                    "<p class=note>Errors (\u00B1, one standard deviation) by drawing the "
                    "samples again from their own errors ({} of 200 drawings gave a "
                    "curve). Errors of dose, flow, volume and background come on "
                    "top.</p>\n",
                    m.errors.n_draws)
              : std::string(
                    "<p class=note>No errors could be given: no drawing of the samples "
                    "from their own errors gave a curve.</p>\n");
  return html;
}

HtmlTable first_order_table(const TracerReportInput& input) {
  HtmlTable table;
  table.caption = "Left of a first-order decay, % of what is fed";
  table.head = {"Rate\n1/d", "One ideal tank", "Plug flow", "Samples"};
  for (const RankedModel& model : input.analysis.models) table.head.push_back(model.fit.name);
  for (std::size_t k = 0; k < input.analysis.conversion.size(); ++k) {
    const auto& row = input.analysis.conversion[k];
    std::vector<std::string> cells{brief(row.rate, 3), brief(100.0 * row.ideal_tank, 3),
                                   brief(100.0 * row.plug_flow, 3), brief(100.0 * row.data, 3)};
    for (const RankedModel& model : input.analysis.models) {
      const auto& left = model.insight.left[k];
      cells.push_back(with_error(100.0 * left.value, 100.0 * left.standard_error, ""));
    }
    table.rows.push_back(std::move(cells));
  }
  return table;
}

HtmlTable second_order_table(const TracerReportInput& input) {
  HtmlTable table;
  table.caption =
      "Left of a second-order decay, % of what is fed: between water that stays apart until it "
      "leaves (segregated) and water that mixes as early as its ages allow (maximum mixedness)";
  table.head = {"k c\u2080\n1/d", "One ideal tank", "Samples"};
  const std::size_t n = std::min(kModelsShown, input.analysis.models.size());
  for (std::size_t m = 0; m < n; ++m) table.head.push_back(input.analysis.models[m].fit.name);
  const auto bounds = [](double a, double b) {
    if (!std::isfinite(a) || !std::isfinite(b)) return std::string("n/a");
    return brief(100.0 * std::min(a, b), 3) + " to " + brief(100.0 * std::max(a, b), 3);
  };
  for (std::size_t k = 0; k < input.analysis.conversion.size(); ++k) {
    const auto& row = input.analysis.conversion[k];
    std::vector<std::string> cells{brief(row.rate, 3), brief(100.0 * row.ideal_second_order, 3),
                                   bounds(row.data_segregated, row.data_maximum_mixed)};
    for (std::size_t m = 0; m < n; ++m) {
      const auto& insight = input.analysis.models[m].insight;
      cells.push_back(bounds(insight.left_segregated[k], insight.left_maximum_mixed[k]));
    }
    table.rows.push_back(std::move(cells));
  }
  return table;
}

HtmlTable young_table(const TracerReportInput& input) {
  HtmlTable table;
  table.caption = "Share of the feed that leaves younger than an age, %";
  table.head = {"Age\nd", "One ideal tank", "Samples"};
  for (const RankedModel& model : input.analysis.models) table.head.push_back(model.fit.name);
  for (std::size_t a = 0; a < input.analysis.young.size(); ++a) {
    const auto& row = input.analysis.young[a];
    std::vector<std::string> cells{brief(row.age, 3), brief(100.0 * row.ideal_tank, 3),
                                   brief(100.0 * row.data, 3)};
    for (const RankedModel& model : input.analysis.models) {
      const auto& younger = model.insight.younger[a];
      cells.push_back(with_error(100.0 * younger.value, 100.0 * younger.standard_error, ""));
    }
    table.rows.push_back(std::move(cells));
  }
  return table;
}

}  // namespace

std::string tracer_moments_section(const TracerReportInput& input) {
  std::string html;
  for (std::size_t p = 0; p < input.analysis.points.size(); ++p) {
    html += moments_of(input, input.analysis.points[p], p == 0);
  }
  return html;
}

std::string tracer_mixing_section(const TracerReportInput& input) {
  return "<p>Whatever the flow pattern, a first-order reaction (hydrolysis, die-off) sees the "
         "residence times only, so this follows from the tracer without any assumption about the "
         "mixing inside (Danckwerts 1953). Second-order reactions also see how early the water "
         "mixes; the two bounds are those of Zwietering (1959).</p>\n" +
         html_of(first_order_table(input)) + html_of(second_order_table(input)) +
         html_of(young_table(input)) +
         "<p class=note>\u00B1: one standard error from the fit; none where the fit gives none. "
         "For pathogens: what leaves young has had little time to die.</p>\n";
}

}  // namespace stillzone::cli
