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
                      html_escaped(network::rule_name(m.curve.rule())), prose(m.tail.note));
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

/// A share as %, "< 0.0001" where it is as good as nothing.
std::string percent(double share) {
  if (share >= 0.0 && share < 1e-6) return "< 0.0001";
  return brief(100.0 * share, 3);
}

std::string percent(const network::Estimate& share) {
  return with_error(100.0 * share.value, 100.0 * share.standard_error, "");
}

/// Adds a row: name, then one cell per column of the table's head.
template <class List, class Cell>
void add_row(HtmlTable& table, const std::string& name, const List& list, const Cell& cell) {
  table.rows.push_back({name});
  for (std::size_t i = 0; i < list.size(); ++i) table.rows.back().push_back(cell(list[i], i));
}

HtmlTable first_order_table(const TracerReportInput& input) {
  const auto& rows = input.analysis.conversion;
  HtmlTable table;
  table.caption = "Left of a first-order decay, % of what is fed";
  table.head = {"At the rate"};
  for (const auto& row : rows) table.head.push_back(brief(row.rate, 3) + " 1/d");
  using Row = network::ConversionRow;
  add_row(table, "one ideal tank", rows,
          [](const Row& r, std::size_t) { return percent(r.ideal_tank); });
  add_row(table, "plug flow", rows, [](const Row& r, std::size_t) { return percent(r.plug_flow); });
  add_row(table, "the samples", rows, [](const Row& r, std::size_t) { return percent(r.data); });
  for (const RankedModel& model : input.analysis.models) {
    add_row(table, model.fit.name, rows,
            [&](const Row&, std::size_t k) { return percent(model.insight.left[k]); });
  }
  return table;
}

HtmlTable second_order_table(const TracerReportInput& input) {
  const auto& rows = input.analysis.conversion;
  HtmlTable table;
  table.caption =
      "Left of a second-order decay, % of what is fed: from maximum mixedness to segregation";
  table.head = {"At k c\u2080"};
  for (const auto& row : rows) table.head.push_back(brief(row.rate, 3) + " 1/d");
  const auto bounds = [](double a, double b) {
    if (!std::isfinite(a) || !std::isfinite(b)) return std::string("n/a");
    return percent(std::min(a, b)) + " to " + percent(std::max(a, b));
  };
  using Row = network::ConversionRow;
  add_row(table, "one ideal tank", rows,
          [](const Row& r, std::size_t) { return percent(r.ideal_second_order); });
  add_row(table, "the samples", rows, [&](const Row& r, std::size_t) {
    return bounds(r.data_segregated, r.data_maximum_mixed);
  });
  for (const RankedModel& model : input.analysis.models) {
    add_row(table, model.fit.name, rows, [&](const Row&, std::size_t k) {
      return bounds(model.insight.left_segregated[k], model.insight.left_maximum_mixed[k]);
    });
  }
  return table;
}

HtmlTable young_table(const TracerReportInput& input) {
  const auto& rows = input.analysis.young;
  HtmlTable table;
  table.caption = "Share of the feed that leaves younger than an age, %";
  table.head = {"Younger than"};
  for (const auto& row : rows) table.head.push_back(brief(row.age, 3) + " d");
  using Row = network::YoungRow;
  add_row(table, "one ideal tank", rows,
          [](const Row& r, std::size_t) { return percent(r.ideal_tank); });
  add_row(table, "the samples", rows, [](const Row& r, std::size_t) { return percent(r.data); });
  for (const RankedModel& model : input.analysis.models) {
    add_row(table, model.fit.name, rows,
            [&](const Row&, std::size_t a) { return percent(model.insight.younger[a]); });
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
         "mixes: they end between water that stays apart until it leaves (segregated) and water "
         "that "
         "mixes as early as its ages allow (maximum mixedness, Zwietering 1959); c\u2080 is the "
         "concentration fed.</p>\n" +
         html_of(first_order_table(input)) + html_of(second_order_table(input)) +
         html_of(young_table(input)) +
         "<p class=note>\u00B1: one standard error from the fit; none where the fit gives none. "
         "n/a: "
         "could not be computed. "
         "For pathogens: what leaves young has had little time to die.</p>\n";
}

}  // namespace stillzone::cli
