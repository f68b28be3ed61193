#include "cli/report/plan_report.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/plan_words.hpp"
#include "cli/report/page.hpp"
#include "cli/report/run_sections.hpp"
#include "cli/report/svg_chart.hpp"
#include "cli/text_table.hpp"

namespace stillzone::cli {
namespace {

std::string list_of(const std::vector<std::string>& sentences) {
  std::string html;
  for (const std::string& sentence : sentences) html += "<li>" + html_escaped(sentence) + "</li>";
  return html.empty() ? "" : "<ul>" + html + "</ul>\n";
}

std::string answer(const PlanReportInput& input) {
  const network::TestPlan& plan = input.plan;
  const network::TracerTest& test = input.request.test;
  std::string detection;
  for (const network::DetectionCurve& curve : plan.detection) {
    detection += fmt::format("<li>{}: {}.</li>", curve.fault, detection_in_words(curve));
  }
  return fmt::format(
             "<p><b>Dose {} kg of {}</b> ({}) and take {} samples over {} d ({} turnovers). A peak "
             "of about {} g/m\u00B3 is expected; the laboratory sees {} g/m\u00B3 and more.</p>"
             "<p>With these samples the test would detect:</p><ul>{}</ul>\n",
             brief(plan.mass / 1000.0), html_escaped(test.tracer), html_escaped(plan.mass_how),
             plan.times.size(), brief(plan.times.back(), 3),
             brief(test.turnovers(plan.times.back()), 2), brief(plan.peak, 3),
             brief(test.points[0].detection_limit, 3), detection) +
         list_of(plan.remarks);
}

Chart curve_chart(const PlanReportInput& input, bool logarithmic) {
  const network::TestPlan& plan = input.plan;
  Chart chart;
  chart.title = logarithmic ? "Expected curves, logarithmic" : "Expected curves";
  chart.x = {.title = "time after the dose", .unit = "d", .low = {}, .high = {}};
  chart.y = {.title = "concentration above background",
             .unit = "g/m\u00B3",
             .logarithmic = logarithmic,
             .low = {},
             .high = {}};
  const double least = 0.1 * input.request.test.points[0].detection_limit;
  std::size_t style = 0;
  for (const network::PlannedModel& model : plan.models) {
    ChartSeries series{.name = model.name, .points = {}, .low = {}, .high = {}, .style = style++};
    for (std::size_t i = 1; i < plan.grid.size(); ++i) {
      if (logarithmic && model.curve[i] < least) continue;
      series.points.push_back({plan.grid[i], model.curve[i]});
    }
    chart.series.push_back(std::move(series));
  }
  ChartSeries samples{.name = "planned samples",
                      .kind = ChartSeries::Kind::points,
                      .points = {},
                      .low = {},
                      .high = {},
                      .style = style};
  const network::PlannedModel& first = plan.models.front();
  for (const double time : plan.times) {
    const double place = time / plan.grid.back() * static_cast<double>(plan.grid.size() - 1);
    const auto i =
        std::clamp<std::size_t>(static_cast<std::size_t>(place), 1, plan.grid.size() - 2);
    const double share = std::clamp(place - static_cast<double>(i), 0.0, 1.0);
    const double value = (1.0 - share) * first.curve[i] + share * first.curve[i + 1];
    if (!logarithmic || value >= least) samples.points.push_back({time, value});
  }
  chart.series.push_back(std::move(samples));
  return chart;
}

std::string sampling_section(const PlanReportInput& input) {
  HtmlTable table{.caption = "Sampling times",
                  .head = {"Sample", "After the dose\nd", "Day and hour"},
                  .rows = {},
                  .left = {}};
  for (std::size_t i = 0; i < input.plan.times.size(); ++i) {
    table.rows.push_back({std::to_string(i + 1), fmt::format("{:.3f}", input.plan.times[i]),
                          day_and_hour(input.plan.times[i])});
  }
  return "<p>Times that carry most information on all the tanks below together (D-optimal); one "
         "in five is spread over the whole test, so that what nobody suspects would show. A "
         "sample some hours late does little harm; write down when it was taken. The same sheet, "
         "to be filled in, is sampling.csv.</p>\n" +
         html_of(table);
}

std::string models_section(const network::TestPlan& plan) {
  HtmlTable table{.caption = "What the samples would tell",
                  .head = {"If the tank is", "Parameter", "Unit", "Suspected",
                           "Expected standard error", "Equal spacing\n%", "Geometric spacing\n%"},
                  .rows = {},
                  .left = {true, true, true, false, false, false, false}};
  for (const network::PlannedModel& model : plan.models) {
    for (std::size_t j = 0; j < model.values.size(); ++j) {
      const double se = model.standard_errors[j];
      const bool first = j == 0 && model.in_design;
      table.rows.push_back({j == 0 ? model.name : "", model.parameters[j].name,
                            model.parameters[j].unit, shown(model.values[j]),
                            std::isfinite(se) ? shown(se, 2) : "not determined",
                            first ? shown(100.0 * model.efficiency_equal, 3) : "",
                            first ? shown(100.0 * model.efficiency_geometric, 3) : ""});
    }
  }
  return html_of(table) +
         "<p>The last columns: how much of the plan's information the same number of equally or "
         "geometrically spaced samples would give (the determinant of the information, per "
         "parameter). The plan serves all tanks at once, so another spacing may do better for one "
         "of them.</p>\n";
}

std::string detection_section(const PlanReportInput& input) {
  Chart chart;
  chart.title = "How often a fault would be seen";
  chart.x = {.title = "size of the fault", .unit = "%", .low = 0.0, .high = {}};
  chart.y = {.title = "simulated tests that show it", .unit = "%", .low = 0.0, .high = 100.0};
  std::string words;
  std::size_t style = 0;
  for (const network::DetectionCurve& curve : input.plan.detection) {
    ChartSeries series{.name = curve.fault, .points = {}, .low = {}, .high = {}, .style = style++};
    for (std::size_t i = 0; i < curve.magnitudes.size(); ++i) {
      series.points.push_back({100.0 * curve.magnitudes[i], 100.0 * curve.power[i]});
    }
    chart.series.push_back(std::move(series));
    words += fmt::format("<li><b>{}</b> ({}): {}.</li>", curve.fault, html_escaped(curve.how),
                         detection_in_words(curve));
  }
  return fmt::format("<ul>{}</ul>\n", words) +
         html_figure("detection", svg_of(chart),
                     fmt::format("{} simulated tests per point with the stated errors, seed {}; a "
                                 "point at 0 is a false alarm.",
                                 input.request.draws, input.request.seed),
                     csv_of(chart));
}

std::string cautions() {
  return "<div class=warn><ul>"
         "<li><b>Lithium salts</b> are harmful if swallowed and irritate skin and eyes: gloves and "
         "goggles, safety data sheet of the salt used. Dissolve it first; lithium chloride gives "
         "off heat. The mass above is lithium, not its salt.</li>"
         "<li><b>The biology</b>: keep the concentration in the tank far below what harms it "
         "(common practice, no source); the expected peak stands above.</li>"
         "<li><b>Discharge</b>: the tracer leaves with digestate and liquor. Ask the authority "
         "that grants the discharge or land-spreading permit before the test.</li>"
         "<li><b>Sampling</b>: biogas burns and displaces air, hydrogen sulphide is poisonous, "
         "digesters are confined spaces, sludge carries pathogens.</li></ul>"
         "<p>Local codes and licensed practice decide.</p></div>\n";
}

}  // namespace

std::string plan_report_page(const PlanReportInput& input) {
  Page page("Plan of a tracer test", input.request.test.title);
  page.add("answer", "The answer", answer(input));
  const Chart linear = curve_chart(input, false);
  const Chart logarithmic = curve_chart(input, true);
  page.add("curves", "What to expect",
           html_figure("expected", svg_of(linear),
                       "Curves of the suspected tanks; the samples stand on the first.",
                       csv_of(linear)) +
               html_figure("expected_log", svg_of(logarithmic),
                           "The same, logarithmic: where the tanks part.", csv_of(logarithmic)));
  page.add("sampling", "When to sample", sampling_section(input));
  page.add("models", "What it would tell", models_section(input.plan));
  page.add("detection", "What it would detect", detection_section(input));
  page.add("assumed", "What was assumed",
           "<ul><li>The flow is constant at the value given, the tracer dissolved and "
           "conservative.</li><li>Errors are normal, independent, as the laboratory states "
           "them.</li><li>The faults are those suspected, at the sizes given; other faults look "
           "different.</li><li>One outlet is sampled: where the stagnant volume lies stays "
           "open.</li></ul>\n");
  page.add("cautions", "Cautions", cautions());
  page.add("provenance", "Provenance", provenance_section(input.provenance));
  return page.html(
      "<footer class=sign><div><span>prepared by</span><span>date</span></div><div><span>checked "
      "by</span><span>date</span></div></footer>\n");
}

}  // namespace stillzone::cli
