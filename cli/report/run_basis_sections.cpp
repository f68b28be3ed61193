// What it rests on: inputs, audits, assumptions, cautions, provenance.
#include <fmt/format.h>

#include "cli/report/page.hpp"
#include "cli/report/run_sections.hpp"
#include "cli/report/sha256.hpp"

namespace stillzone::cli {

namespace {

std::string celsius(core::Temperature temperature) {
  return shown(temperature.value() - 273.15, 4);
}

HtmlTable zone_inputs(const network::Case& the_case, const NetworkFacts& facts) {
  HtmlTable table{
      .caption = "Zones",
      .head = {"Zone", "Volume\nm\u00B3", "Share\n%", "Temperature\n\u00B0C", "kLa\n1/d", "Gas to"},
      .rows = {},
      .left = {}};
  table.left = {true, false, false, false, false, true};
  for (const auto& zone : the_case.zones) {
    table.rows.push_back({zone.name, shown(zone.volume.value()),
                          shown(100.0 * zone.volume.value() / facts.volume, 3),
                          celsius(zone.temperature),
                          zone.gas ? shown(zone.gas->coefficient.value()) : "none",
                          zone.gas ? the_case.headspaces[zone.gas->to.value()].name : "none"});
  }
  return table;
}

HtmlTable flow_inputs(const RunReportInput& input, const NetworkFacts& facts) {
  HtmlTable table;
  table.caption = "Flows, balanced (means over time)";
  table.head = {"From", "To", "Kind", "Schedule", "Flow\nm\u00B3/d"};
  table.left = {true, true, true, true, false};
  const auto streams = input.balance.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const network::Flow& flow = input.the_case.flows[streams[s].flow];
    table.rows.push_back(
        {input.the_case.name_of(streams[s].from), input.the_case.name_of(streams[s].to),
         flow.exchange ? "exchange" : "one way",
         flow.schedule ? input.the_case.schedules[flow.schedule->value()].name : "always",
         shown(facts.rates[s], 5)});
  }
  return table;
}

HtmlTable feed_inputs(const network::Case& the_case) {
  HtmlTable table;
  table.caption = "Feeds (of a record, its first value; components that are 0 everywhere left out)";
  table.head = {"Quantity", "Unit"};
  table.left = {true, true};
  std::vector<std::string> flows{"flow", "m\u00B3/d"};
  for (const auto& feed : the_case.feeds) {
    table.head.push_back(feed.name);
    flows.push_back(shown(feed.flow.value));
  }
  table.rows.push_back(std::move(flows));
  const auto& components = the_case.kinetics.components;
  for (std::size_t c = 0; c < components.size(); ++c) {
    std::vector<std::string> row{components[c].name, components[c].unit};
    bool any = false;
    for (const auto& feed : the_case.feeds) {
      const bool here = c < feed.state.size();
      any = any || (here && (feed.state[c].record || feed.state[c].value > 0.0 ||
                             feed.state[c].value < 0.0));
      row.push_back(here ? shown(feed.state[c].value) : "");
    }
    if (any) table.rows.push_back(std::move(row));
  }
  return table;
}

HtmlTable headspace_inputs(const network::Case& the_case) {
  HtmlTable table;
  table.caption = "Headspaces and their gas pipes";
  table.head = {"Headspace",
                "Volume\nm\u00B3",
                "Temperature\n\u00B0C",
                "Coefficient\nm\u00B3/d/bar",
                "Back pressure\nbar",
                "Opening pressure\nbar"};
  for (const auto& h : the_case.headspaces) {
    table.rows.push_back({h.name, shown(h.volume.value()), celsius(h.temperature),
                          shown(h.pipe.coefficient.value()), shown(h.pipe.back_pressure.value(), 5),
                          shown(h.pipe.opening_pressure.value())});
  }
  return table;
}

}  // namespace

std::string inputs_section(const RunReportInput& input, const NetworkFacts& facts) {
  const network::Case& the_case = input.the_case;
  std::string html = fmt::format(
      "<p>Liquid volume {} m\u00B3, feed {} m\u00B3/d, nominal retention time {} d. Kinetic model: "
      "{} ({}).</p>\n",
      brief(facts.volume), brief(facts.feed), brief(facts.retention),
      html_escaped(the_case.kinetics.name), html_escaped(the_case.kinetics.title));
  html += html_of(zone_inputs(the_case, facts)) + html_of(flow_inputs(input, facts));
  if (!the_case.schedules.empty()) {
    HtmlTable table;
    table.caption = "Schedules";
    table.head = {"Schedule", "Mean factor", "Period\nd"};
    for (const auto& schedule : the_case.schedules) {
      const auto period = schedule.timeline.period();
      const double until = input.result.until > 0.0 ? input.result.until : 365.0;
      table.rows.push_back({schedule.name, shown(schedule.timeline.mean(0.0, until)),
                            period ? shown(*period) : "none"});
    }
    html += html_of(table);
  }
  html += html_of(feed_inputs(the_case));
  if (!the_case.headspaces.empty()) html += html_of(headspace_inputs(the_case));
  return html;
}

std::string audits_section(const RunReportInput& input) {
  const network::RunResult& result = input.result;
  const std::string per = result.kind == "steady" ? " per day" : " over the run";
  HtmlTable table;
  table.caption = "Balances" + per;
  table.head = {"Balance",       "Unit",          "In", "Out with liquid", "Out with gas", "Stored",
                "Made by model", "Relative error"};
  table.left = {true, true};
  for (const auto& b : result.balances) {
    table.rows.push_back({b.name, b.unit, shown(b.inflow, 6), shown(b.liquid_out, 6),
                          shown(b.gas_out, 6), shown(b.stored_change, 6), shown(b.made, 3),
                          shown(b.relative_error, 2)});
  }
  std::string html = html_of(table);
  html +=
      "<p>In + made = out with liquid + out with gas + stored. The relative error is what is "
      "missing "
      "from this equation over what went in: it shows that the equations were assembled and solved "
      "without losing matter, not that the inputs are right. \"Made by model\" is what the "
      "published "
      "kinetic model itself creates or destroys because its stoichiometry does not close.</p>\n";
  const auto& s = result.solver;
  html += html_of({.caption = "Solver",
                   .head = {"Item", "Value"},
                   .rows = {{"method", s.method},
                            {"chosen because", s.reason},
                            {"linear solver", s.linear_solver},
                            {"unknowns", std::to_string(result.unknowns)},
                            {"relative tolerance", shown(input.the_case.run.tolerance, 2)},
                            {"steps (rejected)", fmt::format("{} ({})", s.steps, s.rejected_steps)},
                            {"residual calls", std::to_string(s.rate_calls)},
                            {"Jacobian calls", std::to_string(s.jacobian_calls)},
                            {"factorisations", std::to_string(s.factorisations)},
                            {"switches met exactly", std::to_string(s.switches)},
                            {"seconds of computation", shown(result.seconds, 3)}},
                   .left = {true, true}});
  return html;
}

std::string assumptions_section(const RunReportInput& input) {
  std::string html =
      "<ul><li>Each zone is fully mixed within itself; all that is not mixed stands in the flows "
      "between zones. Whether this network describes the tank has to be shown by a tracer "
      "test.</li>"
      "<li>Liquid volumes are constant; evaporation, foam, scum and grit building up are not "
      "computed.</li>"
      "<li>Solids and dissolved matter move with the water: no settling or floating between "
      "zones.</li>"
      "<li>Temperatures are held as given; heat is not computed.</li>";
  if (!input.the_case.headspaces.empty()) {
    html +=
        "<li>Headspaces are fully mixed ideal gas, saturated with water vapour. Gas leaves by a "
        "one-way pipe at coefficient \u00D7 (pressure \u2212 back pressure \u2212 opening "
        "pressure); its kink at opening is smoothed over a narrow width of pressure.</li>";
  }
  html += "</ul>\n";
  const auto& model = input.the_case.kinetics;
  if (!model.source.empty()) {
    html += fmt::format("<p>Kinetic model {}: {}</p>\n", html_escaped(model.name),
                        html_escaped(model.source));
  }
  if (model.caveats.empty()) return html;
  html += "<p>What the model's own file says of its limits:</p><ul>";
  for (const auto& caveat : model.caveats) html += "<li>" + html_escaped(caveat) + "</li>";
  return html + "</ul>\n";
}

std::string cautions_section() {
  return "<div class=warn><ul>"
         "<li><b>Biogas burns and explodes</b> when mixed with air, and it displaces the air "
         "people "
         "breathe. Keep ignition sources away from vents, pits and opened covers.</li>"
         "<li><b>Hydrogen sulphide</b> in biogas is poisonous at small shares and dulls the sense "
         "of "
         "smell that would warn of it. This run may not compute it; measure it.</li>"
         "<li><b>A digester is a confined space.</b> Entry, also to clean or to place tracer "
         "probes, "
         "only under the site's permit and rescue rules.</li>"
         "<li><b>The headspace is under pressure</b>, and may fall below that of the air when "
         "liquid is drawn. Relief valves and flame arresters are not in this calculation.</li>"
         "<li>Sludge carries pathogens.</li></ul>"
         "<p>Local codes and a licensed engineer decide; this report is a calculation that "
         "supports "
         "their judgement and does not replace it.</p></div>\n";
}

std::string provenance_section(const Provenance& provenance) {
  std::string html =
      html_of({.caption = "",
               .head = {"Item", "Value"},
               .rows = {{"program", "stillzone " + provenance.version},
                        {"input", provenance.input_name},
                        {"SHA-256 of the input file", sha256_hex(provenance.input_text)},
                        {"command", provenance.command_line},
                        {"made", provenance.date}},
               .left = {true, true}});
  return html + "<details><summary>The input file as read</summary><pre>" +
         html_escaped(provenance.input_text) + "</pre></details>\n";
}

}  // namespace stillzone::cli
