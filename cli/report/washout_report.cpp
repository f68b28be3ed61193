#include "cli/report/washout_report.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/report/page.hpp"
#include "cli/report/run_sections.hpp"
#include "cli/report/svg_chart.hpp"
#include "cli/washout_summary.hpp"
#include "cli/washout_tables.hpp"

namespace stillzone::cli {
namespace {

using network::CurvePoint;
using network::LoadCurve;
using Member = double CurvePoint::*;

/// The parts of a branch along which load rises or falls, as curves with x rising.
void add_branch(Chart& chart, const std::string& name, const std::vector<CurvePoint>& points,
                Member member, std::size_t style) {
  ChartSeries series{.name = name,
                     .kind = ChartSeries::Kind::line,
                     .points = {},
                     .low = {},
                     .high = {},
                     .style = style};
  for (const CurvePoint& p : points) {
    if (std::isfinite(p.*member)) series.points.push_back({p.load, p.*member});
  }
  std::ranges::sort(series.points, {}, &ChartPoint::x);
  if (!series.points.empty()) chart.series.push_back(std::move(series));
}

/// The branch in stretches along which load goes one way: the stable part, then those past folds.
void add_curve(Chart& chart, const std::string& name, const LoadCurve& curve, Member member,
               std::size_t style) {
  std::vector<CurvePoint> stretch;
  bool past_fold = false;
  const auto finish = [&] {
    if (stretch.size() < 2) return;
    add_branch(chart, past_fold ? name + ", past the fold" : name, stretch, member,
               past_fold ? style + 2 : style);
  };
  double direction = 0.0;
  for (const CurvePoint& point : curve.points) {
    const double change = stretch.empty() ? 0.0 : point.load - stretch.back().load;
    if (change * direction < 0.0) {
      finish();
      past_fold = true;
      stretch.erase(stretch.begin(), stretch.end() - 1);
    }
    if (std::abs(change) > 0.0) direction = change;
    stretch.push_back(point);
  }
  finish();
  add_branch(chart, name + ", beyond", curve.beyond, member, style + 4);
}

std::string curve_figure(const WashoutReportInput& input, const std::string& anchor,
                         const std::string& title, const std::string& unit, Member member) {
  Chart chart;
  chart.title = title + " against load";
  chart.x.title = "load (today = 1)";
  chart.y = {.title = title, .unit = unit, .logarithmic = false, .low = {}, .high = {}};
  add_curve(chart, "network", input.washout.network, member, 0);
  add_curve(chart, "ideal tank", input.washout.ideal, member, 1);
  if (chart.series.empty()) return "";
  chart.marks.push_back({1.0, "today"});
  chart.zoom = true;
  return html_figure(anchor, svg_of(chart), html_escaped(title) + " of the steady states",
                     csv_of(chart));
}

std::string answer_html(const WashoutReportInput& input) {
  std::string html = "<p>";
  for (const std::string& sentence : washout_answer(input.the_case, input.washout)) {
    html += html_escaped(sentence) + " ";
  }
  html += "</p>\n<div class=warn><ul>";
  for (const std::string& caution : input.washout.cautions) {
    html += "<li>" + html_escaped(caution) + "</li>";
  }
  return html + "</ul></div>\n";
}

std::string curves_html(const WashoutReportInput& input) {
  std::string html =
      curve_figure(input, "methane_load", "Methane at 0 \u00B0C, 1.01325 bar", "m3/d",
                   &CurvePoint::methane_flow) +
      curve_figure(input, "vfa_load", "VFA in the effluent", vfa_unit(input.the_case),
                   &CurvePoint::vfa) +
      curve_figure(input, "ph_load", "pH of the effluent", "", &CurvePoint::ph) +
      curve_figure(input, "cod_load", "Share of COD removed", "", &CurvePoint::cod_removed);
  html += "<p>" + html_escaped(input.washout.network.notes.front()) + ".</p><ul>";
  const auto add_notes = [&](const char* who, const LoadCurve& curve) {
    for (std::size_t k = 1; k < curve.notes.size(); ++k) {
      html += fmt::format("<li>{}: {}</li>", who, html_escaped(curve.notes[k]));
    }
  };
  add_notes("network", input.washout.network);
  add_notes("ideal tank", input.washout.ideal);
  return html + "</ul>\n";
}

std::string margins_html(const WashoutReportInput& input) {
  const auto cell = [](const std::optional<double>& value) {
    return value ? shown(*value, 6) : std::string("none found");
  };
  const auto& network = input.washout.network;
  const auto& ideal = input.washout.ideal;
  const auto failing = [&](const LoadCurve& curve) {
    return curve.first_to_fail ? input.the_case.kinetics.groups[*curve.first_to_fail].name
                               : std::string("\u2013");
  };
  const auto srt = [](const std::optional<double>& rate) {
    return rate && *rate > 0.0 ? shown(1.0 / *rate, 6) : std::string("\u2013");
  };
  HtmlTable table{.caption = "Margins",
                  .head = {"", "network", "ideal tank"},
                  .rows = {},
                  .left = {true, false, false}};
  table.rows.push_back({"state today", network.today_is, ideal.today_is});
  table.rows.push_back(
      {"critical load (today = 1)", cell(network.critical_load), cell(ideal.critical_load)});
  table.rows.push_back(
      {"a failed state stays possible down to load", return_cell(network), return_cell(ideal)});
  table.rows.push_back({"what happens there", end_of_curve(network), end_of_curve(ideal)});
  table.rows.push_back({"first to fail", failing(network), failing(ideal)});
  table.rows.push_back({"state beyond", network.state_beyond, ideal.state_beyond});
  table.rows.push_back(
      {"effluent pH below 6.5 from load", cell(network.sour_load), cell(ideal.sour_load)});
  table.rows.push_back({"half of today's COD removal lost at load",
                        cell(network.half_treatment_load), cell(ideal.half_treatment_load)});
  table.rows.push_back({"washout rate of transport alone [1/d]",
                        cell(input.washout.network_washout_rate),
                        shown(input.washout.ideal_washout_rate, 6)});
  table.rows.push_back({"washout SRT of transport alone [d]",
                        srt(input.washout.network_washout_rate),
                        srt(input.washout.ideal_washout_rate)});
  return html_of(table);
}

std::string warning_html(const WashoutReportInput& input) {
  const auto cell = [](const LoadCurve& curve) {
    return curve.today && curve.today->recovery_rate ? shown(*curve.today->recovery_rate)
                                                     : std::string("not worked out");
  };
  std::string html = html_of(
      {.caption = "Recovery at today's load",
       .head = {"", "network", "ideal tank"},
       .rows = {{"recovery rate [1/d]", cell(input.washout.network), cell(input.washout.ideal)}},
       .left = {true}});
  html +=
      "<p>The recovery rate is minus the real part of the dominant eigenvalue of the steady state: "
      "small disturbances die out at this rate in the end. It cannot exceed the rate at which "
      "water "
      "alone renews the zones, and falls from there towards 0 before a critical "
      "load is reached, so that slower and slower recovery from ordinary upsets is a sign of a "
      "shrinking margin. curve.csv holds it along the curve.</p>\n";
  Chart chart;
  chart.title = "Recovery rate against load";
  chart.x.title = "load (today = 1)";
  chart.y = {.title = "recovery rate", .unit = "1/d", .logarithmic = false, .low = {}, .high = {}};
  const auto add = [&](const char* name, const LoadCurve& curve, std::size_t style) {
    ChartSeries series{.name = name,
                       .kind = ChartSeries::Kind::line,
                       .points = {},
                       .low = {},
                       .high = {},
                       .style = style};
    for (const CurvePoint& p : curve.points) {
      const bool on = series.points.empty() || p.load > series.points.back().x;
      if (p.recovery_rate && on) series.points.push_back({p.load, *p.recovery_rate});
    }
    if (series.points.size() > 1) chart.series.push_back(std::move(series));
  };
  add("network", input.washout.network, 0);
  add("ideal tank", input.washout.ideal, 1);
  if (chart.series.empty()) return html;
  chart.marks.push_back({1.0, "today"});
  return html + html_figure("recovery_load", svg_of(chart),
                            "Recovery rate along the healthy branch", csv_of(chart));
}

std::string groups_html(const WashoutReportInput& input) {
  HtmlTable table{.caption = "Microbial groups by zone, today",
                  .head = {"group", "invasion rate [1/d]", "in ideal tank [1/d]"},
                  .rows = {},
                  .left = {true}};
  for (const std::string& zone : input.washout.zones) table.head.push_back(zone);
  const auto rate = [](const std::optional<network::GroupInvasion>& found) {
    if (!found) return std::string("not worked out");
    return std::abs(found->rate) < 1e-9 ? std::string("0") : shown(found->rate);
  };
  for (const auto& group : input.washout.groups) {
    std::vector<std::string> row{group.name, rate(group.in_network), rate(group.in_ideal)};
    for (std::size_t z = 0; z < input.washout.zones.size(); ++z) {
      std::string cell = life_in_zone(input.the_case, group, z);
      if (group.in_network) cell += fmt::format(" ({})", brief(group.in_network->biomass[z], 3));
      row.push_back(std::move(cell));
    }
    table.rows.push_back(std::move(row));
  }
  return html_of(table) +
         "<p>Invasion rate: largest real part of the eigenvalues of transport + diag(growth \u2212 "
         "decay) at today's state, all else held. It is 0 where the group lives, positive where it "
         "is absent but a few cells would grow into a population, negative where they wash out. "
         "\"sustains itself\": net growth meets the zone's whole outflow; \"grows\": growth "
         "exceeds "
         "decay; \"carried in\": decays there, kept up by what flows in. In brackets the "
         "concentration in the model's unit.</p>\n";
}

std::string assumed_html() {
  return "<ul><li>Loads are steady: every schedule is at its mean, every record at its start.</li>"
         "<li>The ideal tank has the volume of all zones in one mixed zone and gets all feeds, "
         "those that bypass the zones included; temperature and gas transfer are the zones' means "
         "by volume.</li>"
         "<li>\"Soured\" means pH below 6.5 (common practice, no source) or VFA over ten times "
         "that of the healthy state; \"washed out\" names groups of which no more leaves than is "
         "fed.</li>"
         "<li>At a fold the first to fail is the group whose biomass falls fastest in proportion "
         "along the branch; at a washout the one whose biomass reaches 0.</li></ul>\n";
}

}  // namespace

std::string washout_report_page(const WashoutReportInput& input) {
  Page page("Washout report", input.the_case.title);
  page.add("answer", "The answer", answer_html(input));
  page.add("margins", "Margins", margins_html(input));
  page.add("curves", "Load curves", curves_html(input));
  page.add("warning", "Early warning", warning_html(input));
  page.add("groups", "Who can live where", groups_html(input));
  page.add("assumed", "What was assumed", assumed_html());
  page.add("cautions", "Cautions", cautions_section());
  page.add("provenance", "Provenance", provenance_section(input.provenance));
  return page.html(
      "<footer class=sign><div><span>prepared by</span><span>date</span></div><div><span>checked "
      "by</span><span>date</span></div></footer>\n");
}

}  // namespace stillzone::cli
