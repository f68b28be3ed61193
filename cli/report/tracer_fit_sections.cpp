// The models compared, their parameters, and the zones they mean.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "cli/report/network_figure.hpp"
#include "cli/report/page.hpp"
#include "cli/report/tracer_sections.hpp"
#include "cli/report/tracer_words.hpp"
#include "network/tracer/zone_layout.hpp"

namespace stillzone::cli {

namespace {

using network::FittedParameter;
using network::ModelFit;
using network::ZoneLayout;

/// Fixed decimals and a true minus sign.
std::string fixed(double value, int decimals) {
  if (!std::isfinite(value)) return "n/a";
  const std::string text = fmt::format("{:.{}f}", std::fabs(value), decimals);
  const bool zero = text.find_first_not_of("0.") == std::string::npos;
  return (value < 0.0 && !zero ? "\u2212" : "") + text;
}

std::string limit(const std::optional<double>& end) { return end ? shown(*end) : "none"; }

HtmlTable parameter_table(const ModelFit& fit) {
  HtmlTable table;
  table.head = {"Parameter", "Unit", "Value",     "Standard error",
                "95 % from", "to",   "Judgement", "Meaning"};
  table.left = {true, true, false, false, false, false, true, true};
  for (const FittedParameter& p : fit.parameters) {
    std::string verdict = p.verdict;
    if (p.at_bound && verdict.find("bound") == std::string::npos)
      verdict += " (at the bound of the search)";
    table.rows.push_back({p.name, unit_shown(p.unit), shown(p.value),
                          std::isfinite(p.standard_error) ? shown(p.standard_error, 2) : "unknown",
                          limit(p.low), limit(p.high), verdict, p.meaning});
  }
  return table;
}

HtmlTable correlation_table(const ModelFit& fit) {
  HtmlTable table;
  table.head = {""};
  const std::size_t n = fit.parameters.size();
  for (std::size_t a = 0; a < n; ++a) {
    table.head.push_back(fit.parameters[a].name);
    std::vector<std::string> row{fit.parameters[a].name};
    for (std::size_t b = 0; b < n; ++b) row.push_back(fixed(fit.correlation[a * n + b], 2));
    table.rows.push_back(std::move(row));
  }
  return table;
}

std::string parameters_of(const network::RankedModel& ranked, const network::TracerTest& test) {
  const ModelFit& fit = ranked.fit;
  std::string html = fmt::format("<p>In words: {}.</p>\n", model_in_words(fit, test));
  html += html_of(parameter_table(fit));
  if (!fit.remarks.empty()) html += prose_list(fit.remarks);
  const std::size_t n = fit.parameters.size();
  if (n > 1 && fit.correlation.size() == n * n) {
    html += "<details><summary>Correlation of its parameters</summary>" +
            html_of(correlation_table(fit)) + "</details>\n";
  }
  return html;
}

/// Flows [m3/d] of a layout: what is stated, shares of what reaches a zone, and the rest.
std::vector<double> flows_of(const ZoneLayout& layout, double feed) {
  std::map<std::string, double> reached{{"feed", feed}};
  std::map<std::string, double> left = reached;
  std::vector<double> flows;
  for (const ZoneLayout::Flow& flow : layout.flows) {
    if (flow.exchange) {
      flows.push_back(flow.flow ? flow.flow->value : 0.0);
      continue;
    }
    const double amount = flow.flow    ? flow.flow->value
                          : flow.share ? flow.share->value * reached[flow.from]
                                       : left[flow.from];
    left[flow.from] -= amount;
    reached[flow.to] += amount;
    left[flow.to] += amount;
    flows.push_back(amount);
  }
  return flows;
}

/// Whether the volume in use lies below the nominal one with its whole interval.
bool dead_volume_seen(const ModelFit& fit, double nominal) {
  for (const FittedParameter& p : fit.parameters) {
    if (p.name == "volume") return p.high && *p.high < nominal;
    if (p.name == "mixed_fraction") return p.high && *p.high < 1.0;
  }
  return false;
}

NetworkDrawing drawing_of(const ModelFit& fit, const ZoneLayout& layout,
                          const std::vector<double>& flows, const network::TracerTest& test) {
  const double nominal = test.volume.value();
  NetworkDrawing drawing;
  std::map<std::string, std::size_t> box_of;
  const auto add = [&](NetworkDrawing::Box box) {
    box_of[box.name] = drawing.boxes.size();
    drawing.boxes.push_back(std::move(box));
  };
  NetworkDrawing::Box feed;
  feed.kind = NetworkDrawing::Box::Kind::feed;
  feed.name = "feed";
  feed.note = brief(test.mean_flow.value(), 3) + " m\u00B3/d";
  add(std::move(feed));
  double used = 0.0;
  for (const ZoneLayout::Zone& zone : layout.zones) {
    NetworkDrawing::Box box;
    box.name = zone.name;
    box.volume = zone.volume.value;
    box.note = fmt::format("{} m\u00B3, {} %", brief(zone.volume.value, 3),
                           brief(100.0 * zone.volume.value / nominal, 2));
    box.stagnant = zone.still;
    used += zone.volume.value;
    add(std::move(box));
  }
  if (used < 0.995 * nominal && dead_volume_seen(fit, nominal)) {
    NetworkDrawing::Box dead;
    dead.name = "dead";
    dead.volume = nominal - used;
    dead.note = fmt::format("{} m\u00B3, {} %", brief(dead.volume, 3),
                            brief(100.0 * dead.volume / nominal, 2));
    dead.stagnant = true;
    add(std::move(dead));
  }
  NetworkDrawing::Box outlet;
  outlet.kind = NetworkDrawing::Box::Kind::outlet;
  outlet.name = "overflow";
  add(std::move(outlet));
  for (std::size_t f = 0; f < layout.flows.size(); ++f) {
    const ZoneLayout::Flow& flow = layout.flows[f];
    NetworkDrawing::Arrow arrow;
    arrow.from = box_of[flow.from];
    arrow.to = box_of[flow.to];
    arrow.exchange = flow.exchange;
    arrow.flow = flows[f];
    arrow.back = flow.exchange ? flows[f] : 0.0;
    arrow.short_circuit = flow.from == "feed" && flow.to == "overflow";
    drawing.arrows.push_back(arrow);
  }
  return drawing;
}

std::string layout_words(const std::vector<std::string>& notes) {
  std::string words;
  for (const std::string& note : notes) words += " " + prose(note) + ".";
  return words;
}

std::string network_of(const network::RankedModel& ranked, const network::TracerTest& test) {
  const ModelFit& fit = ranked.fit;
  const std::string name = html_escaped(fit.name);
  if (is_own_network(fit)) {
    return fmt::format(
        "<p><b>{}</b> is a network of your own: its zones stand in its case file.</p>\n", name);
  }
  const auto layout = network::zone_layout(fit, test.volume.value(), test.mean_flow.value());
  if (!layout) {
    return fmt::format("<p><b>{}</b> has no drawing in zones: {}</p>\n", name,
                       html_escaped(layout.failure().text()));
  }
  const std::vector<double> flows = flows_of(layout.value(), test.mean_flow.value());
  std::vector<std::string> notes = layout.value().notes;
  double used = 0.0;
  for (const auto& zone : layout.value().zones) used += zone.volume.value;
  if (used < 0.995 * test.volume.value() && !dead_volume_seen(fit, test.volume.value())) {
    notes.emplace_back("The test does not tell it from none, so it is not drawn");
  }
  std::vector<std::vector<std::string>> rows;
  for (const auto& zone : layout.value().zones) {
    rows.push_back({"zone", zone.name, "", zone.still ? "stagnant" : "mixed",
                    fmt::format("{:.6g}", zone.volume.value), "m3"});
  }
  for (std::size_t f = 0; f < flows.size(); ++f) {
    const auto& flow = layout.value().flows[f];
    rows.push_back({"flow", flow.from, flow.to, flow.exchange ? "exchange" : "one way",
                    fmt::format("{:.6g}", flows[f]), "m3/d"});
  }
  return html_figure(
      "network-" + fit.name, svg_of(drawing_of(fit, layout.value(), flows, test)),
      fmt::format("<b>{}</b>: {} (weight {} %). Volumes with their share of the nominal volume; "
                  "hatched: stagnant or dead.{}",
                  name, html_escaped(fit.meaning), brief(100.0 * fit.weight, 2),
                  layout_words(notes)),
      csv_of({"what", "zone or from", "to", "kind", "value", "unit"}, rows));
}

}  // namespace

std::string tracer_ranking_section(const TracerReportInput& input) {
  const auto& models = input.analysis.models;
  std::string html;
  if (!models.empty()) {
    HtmlTable table;
    table.head = {"Model",           "Meaning",         "AICc",
                  "Above best",      "Weight\n%",       "RMSE\ng/m\u00B3",
                  "Scatter\nerrors", "Starts\nagreeing"};
    table.left = {true, true};
    for (const auto& ranked : models) {
      const ModelFit& fit = ranked.fit;
      table.rows.push_back(
          {fit.name, fit.meaning, fixed(fit.aicc, 1), fixed(fit.aicc - models.front().fit.aicc, 1),
           fixed(100.0 * fit.weight, 1), shown(fit.rmse, 3), fixed(fit.residual_deviation, 2),
           fmt::format("{} of {}", fit.starts_agreeing, fit.starts_tried)});
    }
    html += html_of(table) +
            "<p class=note>AICc: corrected Akaike criterion (Hurvich and Tsai 1989), smaller is "
            "better; below 2 above the best the test does not tell the models apart. Weight: share "
            "of the evidence among the models in this table. Scatter: about the fit, in units of "
            "the stated error; near 1 is right. Starts agreeing: how many of the starts of the "
            "search ended in this minimum.</p>\n";
  }
  if (input.analysis.failed.empty()) return html;
  HtmlTable failed;
  failed.caption = "Models that could not be fitted";
  failed.head = {"Model", "Why"};
  failed.left = {true, true};
  for (const auto& model : input.analysis.failed) failed.rows.push_back({model.name, model.reason});
  return html + html_of(failed);
}

std::string tracer_parameter_section(const TracerReportInput& input) {
  std::string html =
      "<p class=note>Intervals: 95 %, by profile likelihood; \"none\" where the interval runs to "
      "the bound of the search. Standard errors: from the covariance of the fit.</p>\n";
  std::string others;
  for (std::size_t m = 0; m < input.analysis.models.size(); ++m) {
    const auto& ranked = input.analysis.models[m];
    const std::string block =
        fmt::format("<h3>{}. {}: {}</h3>\n", m + 1, html_escaped(ranked.fit.name),
                    html_escaped(ranked.fit.meaning)) +
        parameters_of(ranked, input.test) +
        fmt::format("<p class=note>Source of the model: {}.</p>\n",
                    html_escaped(ranked.fit.source));
    (m < kModelsShown ? html : others) += block;
  }
  if (others.empty()) return html;
  return html + "<details><summary>The other models</summary>" + others + "</details>\n";
}

std::string tracer_network_section(const TracerReportInput& input) {
  std::string html;
  for (std::size_t m = 0; m < std::min(kModelsShown, input.analysis.models.size()); ++m) {
    html += network_of(input.analysis.models[m], input.test);
  }
  return html;
}

}  // namespace stillzone::cli
