// The answer of a tracer test in three sentences, and the verdicts.
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

/// Residuals in runs, or wider than the stated errors allow, at 5 %.
bool speaks_against(const network::ModelFit& fit) {
  const bool in_runs = fit.tests.runs_p && *fit.tests.runs_p < 0.05;
  return in_runs || (fit.tests.scatter_p < 0.05 && fit.residual_deviation > 1.0);
}

std::string model_sentence(const TracerReportInput& input) {
  const auto& models = input.analysis.models;
  if (models.empty()) {
    return "<b>No zone model could be fitted</b> to this test; the reasons stand under Models "
           "compared.";
  }
  const RankedModel& best = models.front();
  const std::string name = "<b>" + html_escaped(best.fit.name) + "</b>";
  std::string sentence =
      models.size() == 1
          ? fmt::format("One zone model was fitted, {}: ", name)
          : fmt::format(
                "Of {} zone models fitted, {} explains the samples best (weight {}\u00A0%): ",
                models.size(), name, brief(100.0 * best.fit.weight, 2));
  sentence += model_in_words(best.fit, input.test) + " (95\u00A0% intervals)";
  std::string rivals;
  for (std::size_t m = 1; m < models.size(); ++m) {
    if (models[m].fit.aicc - best.fit.aicc >= 2.0) break;
    rivals += (rivals.empty() ? "" : ", ") + html_escaped(models[m].fit.name);
  }
  if (!rivals.empty()) {
    sentence += fmt::format("; {} explain{} them about as well", rivals,
                            rivals.find(',') == std::string::npos ? "s" : "");
  }
  if (speaks_against(best.fit)) {
    sentence += models.size() > 1 ? "; yet even its residuals speak against it (see the verdict)"
                                  : "; yet its residuals speak against it (see the verdict)";
  }
  return sentence + ".";
}

std::string recovery_sentence(const TracerReportInput& input) {
  const auto& point = input.analysis.points.front();
  std::string sentence;
  if (point.moments) {
    const TracerMoments& moments = *point.moments;
    sentence =
        fmt::format("Without any model, <b>{}</b> of the tracer dosed was found at the {}",
                    with_error(100.0 * moments.recovery, 100.0 * moments.errors.recovery, "%"),
                    html_escaped(point.at));
    if (moments.tail.share > 0.0) {
      sentence += fmt::format(" ({} % of that extrapolated beyond the last sample)",
                              brief(100.0 * moments.tail.share, 2));
    }
  } else {
    sentence =
        fmt::format("Without a model the samples give no recovery: {}", html_escaped(point.reason));
    while (!sentence.empty() && sentence.back() == '.') sentence.pop_back();
  }
  if (input.analysis.models.empty()) return sentence + ".";
  if (!input.test.recovery_fitted) return sentence + "; the fits take it all as recovered.";
  for (const auto& p : input.analysis.models.front().fit.parameters) {
    if (p.name == "recovered_fraction") {
      sentence += fmt::format("; the best fit gives {} (95\u00A0% interval)",
                              interval_in_words(p, 100.0, "%"));
    }
  }
  return sentence + ".";
}

/// When the first tenth of the feed has left: from the samples, or where they begin too late for
/// that, from the best model.
struct FirstTenth {
  double age = 0.0;  ///< [d]; NaN: not known
  std::string words;
};
FirstTenth first_tenth(const TracerReportInput& input, double nominal) {
  const auto& point = input.analysis.points.front();
  const auto& samples = input.test.points.front().samples;
  const bool has_model = !input.analysis.models.empty();
  const double by_model = has_model ? input.analysis.models.front().insight.t10 : std::nan("");
  const std::string of_model =
      fmt::format("<b>{}\u00A0d</b> by the best model", brief(by_model, 3));
  if (!point.moments) return {by_model, of_model};
  const TracerMoments& moments = *point.moments;
  const double first = samples.empty() ? 0.0 : nominal * input.test.turnovers(samples.front().time);
  if (moments.t10 > first) {
    return {moments.t10,
            fmt::format("<b>{}</b>", with_error(moments.t10, moments.errors.t10, "d"))};
  }
  if (has_model) return {by_model, of_model + " (before the first sample)"};
  return {std::nan(""),
          fmt::format("at most <b>{}\u00A0d</b> (before the first sample)", brief(first, 3))};
}

std::string residence_sentence(const TracerReportInput& input) {
  const double nominal = input.test.volume.value() / input.test.mean_flow.value();
  const double ideal = -std::log(0.9) * nominal;
  const auto& point = input.analysis.points.front();
  if (!point.moments && input.analysis.models.empty()) {
    return fmt::format("The nominal residence time is {}\u00A0d; this test adds nothing to it.",
                       brief(nominal, 3));
  }
  std::string sentence;
  if (point.moments) {
    sentence =
        fmt::format("The tracer stays <b>{}</b> on average, {}\u00A0% of the nominal {}\u00A0d",
                    with_error(point.moments->mean, point.moments->errors.mean, "d"),
                    brief(100.0 * point.moments->active_fraction, 3), brief(nominal, 3));
  } else {
    sentence = fmt::format(
        "By the best model the water stays <b>{}\u00A0d</b> on average (nominal {}\u00A0d)",
        brief(input.analysis.models.front().insight.mean, 3), brief(nominal, 3));
  }
  const FirstTenth tenth = first_tenth(input, nominal);
  sentence += fmt::format(
      ", and its first tenth has left after {}, where one ideally mixed tank takes {}\u00A0d",
      tenth.words, brief(ideal, 3));
  if (tenth.age < 0.85 * ideal) return sentence + ": part of the feed leaves too early.";
  if (tenth.age > 1.15 * ideal) {
    return sentence + ": the first of the feed leaves later than from a mixed tank.";
  }
  return sentence + (std::isnan(tenth.age) ? "." : ": near that of a mixed tank.");
}

std::string list_of(const std::string& heading, const std::vector<std::string>& sentences) {
  if (sentences.empty()) return "";
  return fmt::format("<h3>{}</h3>\n", heading) + prose_list(sentences);
}

}  // namespace

std::string tracer_answer_section(const TracerReportInput& input) {
  std::string html =
      fmt::format("<div class=answer><p>{}</p><p>{}</p><p>{}</p></div>\n", model_sentence(input),
                  recovery_sentence(input), residence_sentence(input));
  html +=
      "<p class=note>Intervals and errors come from the scatter of the samples. Errors of dose, "
      "flow and volume come on top and are not in them.</p>\n";
  for (const auto& point : input.analysis.points) {
    const std::string at =
        input.analysis.points.size() > 1 ? " at " + html_escaped(point.at) : std::string();
    if (point.moments) {
      html += list_of("Verdict on the data" + at, point.moments->verdict);
    } else {
      html += list_of("Verdict on the data" + at, {"No moments: " + point.reason});
    }
  }
  const bool in_zones = std::ranges::any_of(
      input.analysis.points, [](const network::PointResult& p) { return p.at != "outlet"; });
  if (in_zones) {
    html +=
        "<p class=note>The verdicts judge each point as if it were the outlet. Inside a zone the "
        "mean age may well be above volume over flow, and recovery is no balance: go by the fits "
        "there.</p>\n";
  }
  if (input.analysis.models.empty()) return html;
  const auto& fit = input.analysis.models.front().fit;
  std::vector<std::string> words = fit.tests.words;
  if (words.empty()) {
    words.emplace_back("The residuals look random and as wide as the stated errors.");
  }
  words.insert(words.end(), fit.remarks.begin(), fit.remarks.end());
  return html + list_of("Verdict on the best fit", words);
}

}  // namespace stillzone::cli
