// What a tracer test rests on and leaves open: limits, inputs, assumptions, cautions.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>
#include <cmath>

#include "cli/report/page.hpp"
#include "cli/report/svg_chart.hpp"
#include "cli/report/tracer_sections.hpp"
#include "cli/report/tracer_words.hpp"

namespace stillzone::cli {

namespace {

using network::SamplingPoint;
using network::TracerSample;
using network::TracerTest;

std::string dose_words(const TracerTest& test) {
  if (const auto* step = std::get_if<network::StepDose>(&test.dose)) {
    return fmt::format("step of {} g/m\u00B3 in the feed from {} d on", brief(step->concentration),
                       brief(test.dose_at));
  }
  const auto& pulse = std::get<network::PulseDose>(test.dose);
  const std::string length =
      pulse.duration > 0.0
          ? "over " + (pulse.duration < 1.0 ? brief(24.0 * pulse.duration, 3) + " h"
                                            : brief(pulse.duration, 3) + " d")
          : "at once";
  return fmt::format("{} kg at {} d, {}", brief(pulse.mass / 1000.0), brief(test.dose_at), length);
}

std::string background_words(const TracerTest& test) {
  const auto& background = test.background;
  std::string words = brief(background.level) + " g/m\u00B3";
  if (std::fabs(background.slope) > 0.0) {
    words += fmt::format(" at the dose, changing by {} g/m\u00B3 per day", brief(background.slope));
  }
  return background.how.empty() ? words : words + " (" + background.how + ")";
}

HtmlTable main_inputs(const TracerTest& test) {
  HtmlTable table;
  table.head = {"Item", "Value"};
  table.left = {true, true};
  table.rows = {
      {"tracer", test.tracer + (test.conservative ? ", conservative" : ", not conservative")},
      {"nominal volume", brief(test.volume.value()) + " m\u00B3"},
      {test.flow_record ? "flow, mean (record below)" : "flow, constant",
       brief(test.mean_flow.value()) + " m\u00B3/d"},
      {"nominal retention time", brief(test.volume.value() / test.mean_flow.value()) + " d"},
      {"dose", dose_words(test)},
      {"dosed into", test.dose_into},
      {"background", background_words(test)},
      {"recovery", test.recovery_fitted ? "fitted" : "as dosed"},
      {"outlying samples", test.robust ? "count less (robust loss)" : "count in full"}};
  return table;
}

std::string error_words(const SamplingPoint& point) {
  std::string words;
  if (point.error_absolute > 0.0) words = brief(point.error_absolute) + " g/m\u00B3";
  if (point.error_relative > 0.0) {
    words += (words.empty() ? "" : " and ") + brief(100.0 * point.error_relative, 3) + " %";
  }
  return words.empty() ? "not stated" : words;
}

void add_samples(const std::vector<TracerSample>& samples, const char* when, HtmlTable& table) {
  for (const TracerSample& s : samples) {
    table.rows.push_back({brief(s.time, 6), (s.censored ? "< " : "") + brief(s.value, 5),
                          brief(s.error, 3), when, std::to_string(s.n_averaged),
                          std::to_string(s.line)});
  }
}

std::string point_inputs(const SamplingPoint& point) {
  std::string html = fmt::format(
      "<h3>Samples at {}</h3>\n<p>{} from {}; {} before the dose, {} from it on, {} of them under "
      "the detection limit. Error of one reading (standard deviation): {}. Detection limit: "
      "{}.</p>\n",
      html_escaped(point.at), point.before.size() + point.samples.size(), html_escaped(point.csv),
      point.before.size(), point.samples.size(),
      std::ranges::count_if(point.samples, &TracerSample::censored), error_words(point),
      point.detection_limit > 0.0 ? brief(point.detection_limit) + " g/m\u00B3" : "not stated");
  if (!point.notes.empty()) html += "<p>Cleaned:</p>" + prose_list(point.notes);
  HtmlTable table;
  table.head = {"Time\nd", "Value\ng/m\u00B3", "Error\ng/m\u00B3", "", "Readings", "Line"};
  table.left = {false, false, false, true};
  add_samples(point.before, "before the dose", table);
  add_samples(point.samples, "", table);
  constexpr std::size_t kMostPrinted = 150;
  return html +
         fmt::format("<details{}><summary>All samples as read (background still in them)</summary>",
                     table.rows.size() <= kMostPrinted ? " class=printed" : "") +
         html_of(table) + "</details>\n";
}

std::string flow_figure(const TracerTest& test) {
  if (!test.flow_record) return "";
  double from = test.dose_at;
  double to = test.dose_at;
  for (const SamplingPoint& point : test.points) {
    if (!point.before.empty()) from = std::min(from, point.before.front().time);
    if (!point.samples.empty()) to = std::max(to, point.samples.back().time);
  }
  std::vector<double> times;
  std::vector<double> flows;
  double at = from;
  while (at < to) {
    const double until = std::min(test.flow_record->next_switch(at).value_or(to), to);
    times.insert(times.end(), {at, until});
    flows.insert(flows.end(), 2, test.flow_record->value_from(at));
    at = until;
  }
  if (times.empty()) return "";
  Chart chart;
  chart.title = "Flow during the test";
  chart.x = {"time", "d", false, {}, {}};
  chart.y = {"flow", "m\u00B3/d", false, {}, {}};
  ChartSeries record;
  record.name = "flow";
  record.points = decimated(times, flows, 300);
  chart.series.push_back(std::move(record));
  chart.marks = {{test.dose_at, "dose"}};
  Chart whole = chart;
  whole.series.front().points.clear();
  for (std::size_t i = 0; i < times.size(); ++i) {
    whole.series.front().points.push_back({times[i], flows[i]});
  }
  return "<div class=charts>" +
         html_figure("flow", svg_of(chart),
                     "<b>Flow during the test.</b> Each value holds until the next.",
                     csv_of(whole)) +
         "</div>\n";
}

bool is_lithium(std::string tracer) {
  for (char& c : tracer) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
  return tracer.find("lithium") != std::string::npos || tracer == "li" || tracer == "li+" ||
         tracer.find("licl") != std::string::npos;
}

}  // namespace

std::string tracer_open_section(const TracerReportInput& input) {
  std::vector<std::string> words = input.analysis.cannot_tell;
  words.insert(words.end(), input.remarks.begin(), input.remarks.end());
  return words.empty() ? "<p>Nothing was noted.</p>\n" : prose_list(words);
}

std::string tracer_inputs_section(const TracerReportInput& input) {
  std::string html = html_of(main_inputs(input.test));
  if (!input.test.notes.empty())
    html += "<p>Noted while reading:</p>" + prose_list(input.test.notes);
  html += flow_figure(input.test);
  for (const SamplingPoint& point : input.test.points) html += point_inputs(point);
  return html;
}

std::string tracer_assumptions_section(const TracerReportInput& input) {
  std::vector<std::string> words = {
      "The liquid volume is constant over the test, and is the nominal volume stated.",
      "The tracer is dissolved, moves with the water, and does not change the flow (density, "
      "temperature).",
      input.test.conservative
          ? "The tracer neither decays nor is taken up: as stated in the test."
          : "The tracer is stated as not conservative; no decay is taken off, so recovery and mean "
            "come out too low.",
      "The background under the tracer is as stated or found above, also where no sample tells.",
      "Zones of a model are each fully mixed; plug sections and dispersion as their names say.",
      "Errors of the samples are independent of each other and have the standard deviation "
      "stated; intervals follow the scatter seen about the fit.",
      "A sample under the detection limit is known only to lie below it; the fits use just that, "
      "no value is put in its place."};
  if (input.test.flow_record) {
    words.emplace_back(
        "The flow varied: time is counted in turnovers (the integral of flow over volume), and "
        "all flows of a model, exchanges included, go with the feed flow. Exchange driven by "
        "mixers would not; days in this report are turnovers times the nominal retention time.");
  } else {
    words.emplace_back("The flow was constant over the whole test.");
  }
  for (const auto& point : input.analysis.points) {
    if (point.moments && point.moments->before_first_sample > 0.0) {
      words.emplace_back(fmt::format(
          "Without a model, at {}: before the first sample the curve is taken as rising from 0 at "
          "the dose where it rises there, as level where it falls.",
          point.at));
    }
  }
  return prose_list(words);
}

std::string tracer_cautions_section(const TracerReportInput& input) {
  std::string html = "<div class=warn><ul>";
  if (is_lithium(input.test.tracer)) {
    html +=
        "<li><b>Lithium salts</b> are harmful if swallowed and irritate skin and eyes: gloves and "
        "goggles, follow the safety data sheet of the salt used. Dissolving lithium chloride in "
        "water gives off heat.</li>";
  } else {
    html +=
        "<li><b>The tracer</b>: follow the safety data sheet of the substance used; gloves and "
        "goggles when it is weighed and dissolved.</li>";
  }
  return html +
         "<li><b>Discharge</b>: the tracer leaves with the digestate and the returned liquor. "
         "Ask the authority that grants the discharge or land-spreading permit before a "
         "test, and keep its answer.</li>"
         "<li><b>Biogas</b> at sampling points and open covers burns, explodes when mixed with "
         "air, and displaces the air people breathe. No ignition sources; gas monitor on the "
         "person.</li>"
         "<li><b>Hydrogen sulphide</b> is poisonous at small shares and dulls the sense of smell "
         "that would warn of it: measure it.</li>"
         "<li><b>Confined spaces</b>: digesters, pits and chambers are entered, and probes placed "
         "in them, only under the site's permit and rescue rules.</li>"
         "<li><b>Covers, ladders and edges are slippery</b>; sample from guarded places, not "
         "alone.</li>"
         "<li><b>Sludge carries pathogens</b>: wash hands, cover cuts, no food near "
         "samples.</li></ul>"
         "<p>Local codes and a licensed engineer decide; this report is a calculation that "
         "supports their judgement and does not replace it.</p></div>\n";
}

}  // namespace stillzone::cli
