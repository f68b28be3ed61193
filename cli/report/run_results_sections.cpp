// What came out: answer, network, zones, gas, histories.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/report/bar_figure.hpp"
#include "cli/report/history_figures.hpp"
#include "cli/report/page.hpp"
#include "cli/report/run_sections.hpp"

namespace stillzone::cli {

namespace {

using network::NamedValue;
using network::PlaceState;

std::string with_unit(double value, const std::string& unit) {
  return unit.empty() || unit == "1" ? brief(value) : brief(value) + " " + unit;
}

/// The places of a kind with the lowest and the highest value of a quantity.
struct Extremes {
  const PlaceState* lowest = nullptr;
  const PlaceState* highest = nullptr;
  double low = 0.0;
  double high = 0.0;
  std::string unit;
};
Extremes extremes_of(const std::vector<PlaceState>& zones, const std::string& name) {
  Extremes found;
  for (const PlaceState& zone : zones) {
    const auto value = value_at(zone, name);
    if (!value) continue;
    found.unit = value->unit;
    if (found.lowest == nullptr || value->value < found.low) {
      found.lowest = &zone;
      found.low = value->value;
    }
    if (found.highest == nullptr || value->value > found.high) {
      found.highest = &zone;
      found.high = value->value;
    }
  }
  return found;
}

std::string when(const network::RunResult& result) {
  if (result.kind == "steady") return "At steady state";
  if (result.kind == "periodic") return "At the start of its repeating cycle";
  return "At the end of day " + brief(result.until);
}

/// What the gas is a mean over.
std::string mean_over(const network::RunResult& result) {
  if (result.kind == "steady") return "At steady state";
  if (result.kind == "periodic") return "On average over its repeating cycle";
  return "On average over the run";
}

std::string gas_sentence(const RunReportInput& input, const NetworkFacts& facts) {
  double methane = 0.0;
  double gas = 0.0;
  for (const auto& headspace : input.result.headspaces) {
    methane += headspace.mean_methane_flow_normal;
    gas += headspace.mean_gas_flow_normal_dry;
  }
  const std::string feed = fmt::format("from {} m\u00B3/d of feed (nominal retention time {} d)",
                                       brief(facts.feed), brief(facts.retention, 3));
  if (input.result.headspaces.empty()) {
    return fmt::format("{} the case has no headspace, so no gas is computed, {}.",
                       when(input.result), feed);
  }
  if (!(gas > 0.0)) {
    return fmt::format("{} no gas leaves the digester, {}.", mean_over(input.result), feed);
  }
  return fmt::format(
      "{} the digester gives <b>{} m\u00B3/d of methane</b> (0 \u00B0C, 1.01325 "
      "bar), {} % of its dry gas, {}.",
      mean_over(input.result), brief(methane), brief(100.0 * methane / gas, 3), feed);
}

std::string water_sentence(const RunReportInput& input) {
  const std::string& vfa = input.the_case.kinetics.vfa;
  const bool has_vfa = !vfa.empty();
  const std::string lead = has_vfa ? vfa : "pH";
  const Extremes range = extremes_of(input.result.zones, lead);
  if (range.lowest == nullptr) return "The kinetic model has neither VFA nor pH to judge zones by.";
  std::string text = input.result.kind == "steady" ? "" : when(input.result) + ": ";
  for (const auto& outlet : input.result.outlets) {
    const auto value = value_at(outlet.state, lead);
    const auto ph = value_at(outlet.state, "pH");
    if (!value) continue;
    text += fmt::format("Outlet {} leaves with <b>{} {}</b>", html_escaped(outlet.name),
                        html_escaped(lead), html_escaped(with_unit(value->value, value->unit)));
    if (ph && has_vfa) text += fmt::format(" and pH {}", brief(ph->value, 3));
    text += ", ";
  }
  if (input.result.zones.size() == 1) {
    return text +
           fmt::format("its one zone holds {}.", html_escaped(with_unit(range.low, range.unit)));
  }
  const PlaceState* worst = has_vfa ? range.highest : range.lowest;
  const double best_value = has_vfa ? range.low : range.high;
  const double worst_value = has_vfa ? range.high : range.low;
  text +=
      fmt::format("while the zones run from {} to {}: <b>the worst is {}</b>", brief(best_value),
                  html_escaped(with_unit(worst_value, range.unit)), html_escaped(worst->place));
  const auto ph = value_at(*worst, "pH");
  if (ph && has_vfa) text += fmt::format(" (pH {})", brief(ph->value, 3));
  return text + ".";
}

std::string balance_sentence(const network::RunResult& result) {
  if (result.balances.empty()) return "No balance was drawn up.";
  double worst = 0.0;
  std::string names;
  for (const auto& balance : result.balances) {
    if (!(balance.relative_error <= worst)) worst = balance.relative_error;
    names += (names.empty() ? "" : ", ") + balance.name;
  }
  return fmt::format(
      "The balances of {} close to {} of what went in{}.", html_escaped(names), brief(worst, 2),
      result.warnings.empty() ? ""
                              : fmt::format("; {} warning{} stand{} below", result.warnings.size(),
                                            result.warnings.size() == 1 ? "" : "s",
                                            result.warnings.size() == 1 ? "s" : ""));
}

/// Quantities worth a column: pH, then those derived that are no mere ions or factors, at most 6.
std::vector<std::string> key_quantities(const RunReportInput& input) {
  std::vector<std::string> names;
  const auto& model = input.the_case.kinetics;
  for (const auto& implicit : model.implicits) {
    if (implicit.name == "pH") names.push_back(implicit.name);
  }
  for (const auto& derived : model.derived) {
    if (names.size() < 7) names.push_back(derived.name);
  }
  if (names.empty()) {
    for (const auto& component : model.components) {
      if (names.size() < 6) names.push_back(component.name);
    }
  }
  return names;
}

std::vector<const PlaceState*> places_of(const network::RunResult& result) {
  std::vector<const PlaceState*> places;
  for (const auto& zone : result.zones) places.push_back(&zone);
  for (const auto& outlet : result.outlets) places.push_back(&outlet.state);
  return places;
}

HtmlTable zone_table(const RunReportInput& input, const NetworkFacts& facts) {
  const auto& zones = input.result.zones;
  HtmlTable table;
  table.head = {"Zone", "Volume\nm\u00B3", "Turnover\nd"};
  const auto names = key_quantities(input);
  const auto places = places_of(input.result);
  for (const std::string& name : names) {
    const auto value = places.empty() ? std::nullopt : value_at(*places.front(), name);
    const bool bare = !value || value->unit.empty() || value->unit == "1";
    table.head.push_back(bare ? name : name + "\n" + value->unit);
  }
  for (std::size_t p = 0; p < places.size(); ++p) {
    std::vector<std::string> row;
    const bool zone = p < zones.size() && p < facts.zones.size();
    row.push_back(zone ? places[p]->place : "outlet " + places[p]->place);
    row.push_back(zone ? shown(input.the_case.zones[p].volume.value()) : "");
    row.push_back(zone ? shown(facts.zones[p].turnover, 3) : "");
    for (const std::string& name : names) {
      const auto value = value_at(*places[p], name);
      row.push_back(value ? shown(value->value) : "");
    }
    table.rows.push_back(std::move(row));
  }
  return table;
}

HtmlTable full_table(const network::RunResult& result) {
  HtmlTable table;
  const auto places = places_of(result);
  table.head = {"Quantity", "Unit"};
  table.left = {true, true};
  for (const PlaceState* place : places) table.head.push_back(place->place);
  if (places.empty()) return table;
  for (const auto* list : {&places.front()->state, &places.front()->derived}) {
    for (const NamedValue& quantity : *list) {
      std::vector<std::string> row{quantity.name, quantity.unit};
      for (const PlaceState* place : places) {
        const auto value = value_at(*place, quantity.name);
        row.push_back(value ? shown(value->value, 6) : "");
      }
      table.rows.push_back(std::move(row));
    }
  }
  return table;
}

std::string bars_of(const RunReportInput& input, const std::string& name, double base,
                    const std::string& caption) {
  std::vector<Bar> bars;
  std::vector<std::vector<std::string>> rows;
  std::string unit;
  const auto places = places_of(input.result);
  for (std::size_t p = 0; p < places.size(); ++p) {
    const auto value = value_at(*places[p], name);
    if (!value) continue;
    unit = value->unit;
    const bool outlet = p >= input.result.zones.size();
    bars.push_back({places[p]->place, value->value, outlet});
    rows.push_back(
        {places[p]->place, outlet ? "outlet" : "zone", fmt::format("{:.6g}", value->value)});
  }
  if (bars.empty()) return "";
  const std::string title = unit.empty() || unit == "1" ? name : name + " [" + unit + "]";
  return html_figure("zones-" + name, svg_of_bars(title, bars, base), caption,
                     csv_of({"place", "kind", title}, rows));
}

/// Columns of a history with this quantity, at the places named.
std::vector<std::size_t> columns_of(const network::Series& series, const std::string& quantity) {
  std::vector<std::size_t> columns;
  for (std::size_t c = 0; c < series.columns.size(); ++c) {
    const auto& column = series.columns[c];
    if (column.quantity == quantity && column.values.size() == series.time.size()) {
      columns.push_back(c);
    }
  }
  return columns;
}

}  // namespace

std::string answer_section(const RunReportInput& input, const NetworkFacts& facts) {
  std::string html = fmt::format("<div class=answer><p>{}</p><p>{}</p><p>{}</p></div>\n",
                                 gas_sentence(input, facts), water_sentence(input),
                                 balance_sentence(input.result));
  if (!input.result.solution_note.empty()) {
    html += fmt::format("<p>How it was found: {}.</p>\n", html_escaped(input.result.solution_note));
  }
  html +=
      "<p class=note>One calculation with the inputs as given: their uncertainty is not in these "
      "numbers, and the error of the numerical solution (below) is no measure of it.</p>\n";
  std::vector<std::string> warnings = input.the_case.warnings;
  for (const auto& w : input.balance.warnings()) warnings.push_back(w);
  for (const auto& w : input.result.warnings) warnings.push_back(w);
  if (warnings.empty()) return html;
  html += "<div class=warn><b>Warnings</b><ul>";
  for (const auto& warning : warnings) html += "<li>" + html_escaped(warning) + "</li>";
  return html + "</ul></div>\n";
}

std::string network_section(const RunReportInput& input, const NetworkFacts& facts) {
  std::vector<std::vector<std::string>> rows;
  const auto streams = input.balance.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    rows.push_back({input.the_case.name_of(streams[s].from), input.the_case.name_of(streams[s].to),
                    input.the_case.flows[streams[s].flow].exchange ? "exchange" : "one way",
                    fmt::format("{:.8g}", facts.rates[s])});
  }
  std::string caption =
      "<b>The zone network.</b> Below each zone its volume and turnover time (volume over all that "
      "flows in). Flows are means over time.";
  std::string html = html_figure("network", svg_of(network_drawing(input, facts)), caption,
                                 csv_of({"from", "to", "kind", "flow [m3/d]"}, rows));
  std::string findings;
  for (std::size_t z = 0; z < facts.zones.size(); ++z) {
    const ZoneFacts& zone = facts.zones[z];
    const std::string name = html_escaped(input.the_case.zones[z].name);
    if (zone.stagnant) {
      findings += fmt::format(
          "<li><b>{}</b> is stagnant: all that flows in turns it over once in {} d, more slowly "
          "than the feed the whole tank ({} d); it holds {} % of the volume.</li>",
          name, brief(zone.turnover, 3), brief(facts.retention, 3),
          brief(100.0 * input.the_case.zones[z].volume.value() / facts.volume, 3));
    }
    if (zone.short_circuit) {
      findings += fmt::format(
          "<li>Short circuit through <b>{}</b>: {} % of the feed enters it and {} m\u00B3/d leave "
          "the digester from it; it turns over in {} d.</li>",
          name, brief(100.0 * zone.feed / facts.feed, 3), brief(zone.drawn, 3),
          brief(zone.turnover, 2));
    }
  }
  if (facts.bypass > 0.0) {
    findings +=
        fmt::format("<li>{} % of the feed goes straight to an outlet and meets no zone.</li>",
                    brief(100.0 * facts.bypass / facts.feed, 3));
  }
  if (findings.empty())
    return html + "<p>No zone is stagnant and no short circuit was found.</p>\n";
  return html + "<ul>" + findings + "</ul>\n";
}

std::string zones_section(const RunReportInput& input, const NetworkFacts& facts) {
  std::string html = html_of(zone_table(input, facts));
  const std::string& vfa = input.the_case.kinetics.vfa;
  std::string bars;
  if (!vfa.empty()) {
    bars +=
        bars_of(input, vfa, 0.0, "<b>" + html_escaped(vfa) + "</b> by place; hollow: an outlet.");
  }
  const Extremes ph = extremes_of(input.result.zones, "pH");
  if (ph.lowest != nullptr) {
    const double base = std::max(0.0, std::floor(ph.low - 0.5));
    bars += bars_of(input, "pH", base,
                    fmt::format("<b>pH</b> by place; bars start at pH {:g}, not at 0.", base));
  }
  html += "<div class=charts>" + bars + "</div>";
  const HtmlTable table = full_table(input.result);
  return html + "<details><summary>Every quantity of every zone</summary>" + html_of(table) +
         "</details>\n";
}

std::string gas_section(const RunReportInput& input) {
  if (input.result.headspaces.empty()) return "<p>The case has no headspace.</p>\n";
  HtmlTable table;
  table.head = {"Headspace", "Unit"};
  table.left = {true, true};
  table.rows = {{"pressure, water vapour included", "bar"},
                {"gas flow, wet, at the pipe's back pressure", "m\u00B3/d"},
                {"gas flow, dry, 0 \u00B0C and 1.01325 bar", "m\u00B3/d"},
                {"methane flow, 0 \u00B0C and 1.01325 bar", "m\u00B3/d"},
                {"methane share of the dry gas", "%"},
                {"pipe", ""},
                {"mean gas flow, dry, 0 \u00B0C and 1.01325 bar", "m\u00B3/d"},
                {"mean methane flow, 0 \u00B0C and 1.01325 bar", "m\u00B3/d"}};
  for (const auto& h : input.result.headspaces) {
    table.head.push_back(h.name);
    const std::vector<std::string> cells = {shown(h.pressure, 5),
                                            shown(h.gas_flow),
                                            shown(h.gas_flow_normal_dry),
                                            shown(h.methane_flow_normal),
                                            shown(100.0 * h.methane_share_dry, 3),
                                            h.pipe_open ? "open" : "closed",
                                            shown(h.mean_gas_flow_normal_dry),
                                            shown(h.mean_methane_flow_normal)};
    for (std::size_t i = 0; i < cells.size(); ++i) table.rows[i].push_back(cells[i]);
  }
  const auto& first = input.result.headspaces.front().state;
  for (const auto* list : {&first.state, &first.derived}) {
    for (const NamedValue& quantity : *list) {
      std::vector<std::string> row{quantity.name, quantity.unit};
      for (const auto& h : input.result.headspaces) {
        const auto value = value_at(h.state, quantity.name);
        row.push_back(value ? shown(value->value) : "");
      }
      table.rows.push_back(std::move(row));
    }
  }
  const std::string intro =
      input.result.kind == "steady"
          ? std::string()
          : fmt::format("<p>{}; means are over the {}.</p>\n", when(input.result),
                        input.result.kind == "periodic" ? "cycle" : "whole run");
  return intro + html_of(table);
}

std::string history_section(const RunReportInput& input) {
  const network::Series& series = input.result.series;
  std::vector<HistoryChart> charts;
  const auto add = [&](const std::string& quantity, const std::string& title) {
    HistoryChart chart;
    chart.name = "history-" + quantity;
    chart.title = title;
    chart.columns = columns_of(series, quantity);
    if (chart.columns.empty()) return;
    chart.unit = series.columns[chart.columns.front()].unit;
    charts.push_back(std::move(chart));
  };
  if (!input.the_case.kinetics.vfa.empty())
    add(input.the_case.kinetics.vfa, input.the_case.kinetics.vfa);
  add("pH", "pH");
  add("methane_flow_normal", "methane flow, 0 \u00B0C, 1.01325 bar");
  add("gas_flow_normal_dry", "gas flow, dry, 0 \u00B0C, 1.01325 bar");
  add("pressure", "headspace pressure");
  add("flow", "flow of feeds and outlets");
  return history_figures(series, charts);
}

}  // namespace stillzone::cli
