#include "cli/report/tracer_words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "cli/report/page.hpp"
#include "network/tracer/rtd_model.hpp"

namespace stillzone::cli {

namespace {

using network::FittedParameter;
using network::ModelFit;
using network::TracerTest;

/// Decimals that still show a width with one or two digits.
int decimals_for(double width) {
  if (!(width > 0.0)) return 3;
  return std::clamp(-static_cast<int>(std::floor(std::log10(0.5 * width))), 0, 8);
}

std::string joined(const std::string& number, const std::string& unit) {
  const std::string text = unit_shown(unit);
  return text.empty() ? number : number + "\u00A0" + text;
}

const FittedParameter& parameter(const ModelFit& fit, const char* name) {
  return *std::ranges::find(fit.parameters, name, &FittedParameter::name);
}

std::string percent(const ModelFit& fit, const char* name, bool complement = false) {
  return interval_in_words(parameter(fit, name), 100.0, "%", complement);
}

/// "2310 to 2530 m3, 77 to 84 % of the nominal volume"
std::string volume_words(const ModelFit& fit, const TracerTest& test) {
  const FittedParameter& volume = parameter(fit, "volume");
  const double nominal = test.volume.value();
  std::string words =
      fmt::format("<b>{}</b>, {} of the nominal volume", interval_in_words(volume, 1.0, "m\u00B3"),
                  interval_in_words(volume, 100.0 / nominal, "%"));
  if (volume.low && *volume.low > nominal) {
    words += " (more than the tank holds: check volume and flow)";
  }
  return words;
}

std::string tanks_words(const ModelFit& fit) {
  const FittedParameter& tanks = parameter(fit, "tanks");
  std::string words =
      fmt::format("<b>{}</b> equal mixed tanks in a row", interval_in_words(tanks, 1.0, ""));
  if (tanks.value < 1.0) words += " (below one: more spread than a mixed tank has)";
  return words;
}

std::string exchange_words(const ModelFit& fit, const TracerTest& test) {
  const FittedParameter& exchange = parameter(fit, "exchange_flow");
  return fmt::format("<b>{}</b> with the mixed rest ({} of the flow)",
                     interval_in_words(exchange, 1.0, "m\u00B3/d"),
                     interval_in_words(exchange, 100.0 / test.mean_flow.value(), "%"));
}

std::string still_words(const ModelFit& fit, const TracerTest& test) {
  const FittedParameter& mixed = parameter(fit, "mixed_fraction");
  return fmt::format("<b>{}</b> of the nominal volume ({}) stands still",
                     percent(fit, mixed.name.c_str(), true),
                     interval_in_words(mixed, test.volume.value(), "m\u00B3", true));
}

std::string listed(const ModelFit& fit) {
  std::string words;
  for (const FittedParameter& p : fit.parameters) {
    if (p.name == "recovered_fraction") continue;
    words += fmt::format("{}{} <b>{}</b>", words.empty() ? "" : ", ", html_escaped(p.name),
                         html_escaped(interval_in_words(p, 1.0, p.unit)));
  }
  return words.empty() ? "nothing of it was free but the recovery" : words;
}

}  // namespace

std::string unit_shown(const std::string& unit) {
  if (unit == "1") return "";
  std::string text = unit;
  for (const auto& [plain, raised] : {std::pair{"m3", "m\u00B3"}, std::pair{"d2", "d\u00B2"}}) {
    const auto at = text.find(plain);
    if (at != std::string::npos) text.replace(at, 2, raised);
  }
  return text;
}

std::string range_in_words(std::optional<double> low, std::optional<double> high, double value,
                           const std::string& unit) {
  if (low && high) {
    const int decimals = decimals_for(*high - *low);
    std::string from = fmt::format("{:.{}f}", *low, decimals);
    const std::string to = fmt::format("{:.{}f}", *high, decimals);
    if (*low < 0.0) from = "\u2212" + fmt::format("{:.{}f}", -*low, decimals);
    return joined(from == to ? to : from + " to " + to, unit);
  }
  if (high) return "at most " + joined(brief(*high, 3), unit);
  if (low) return "at least " + joined(brief(*low, 3), unit);
  return "about " + joined(brief(value, 2), unit) + " (not held by this test)";
}

std::string interval_in_words(const FittedParameter& parameter, double factor,
                              const std::string& unit, bool complement) {
  const auto turned = [&](const std::optional<double>& end) {
    return end ? std::optional(factor * (complement ? 1.0 - *end : *end)) : std::nullopt;
  };
  auto low = turned(parameter.low);
  auto high = turned(parameter.high);
  if (complement) std::swap(low, high);
  return range_in_words(low, high, factor * (complement ? 1.0 - parameter.value : parameter.value),
                        unit);
}

bool is_own_network(const ModelFit& fit) {
  const auto ours = network::rtd_model_names();
  return fit.source == "the user's own network" || std::ranges::find(ours, fit.name) == ours.end();
}

std::string model_in_words(const ModelFit& fit, const TracerTest& test) {
  if (is_own_network(fit)) return listed(fit);
  const std::string& name = fit.name;
  if (name == "one_tank")
    return "the tank works as one well-mixed tank of " + volume_words(fit, test);
  if (name == "tanks_in_series") {
    return fmt::format("the water passes {} of {} in all", tanks_words(fit),
                       volume_words(fit, test));
  }
  if (name == "bypass_dead") {
    return fmt::format(
        "<b>{}</b> of the feed leaves at once, and <b>{}</b> of the nominal volume is well mixed, "
        "the rest dead",
        percent(fit, "bypass_fraction"), percent(fit, "mixed_fraction"));
  }
  if (name == "stagnant_exchange") {
    return fmt::format("{}, exchanging {}", still_words(fit, test), exchange_words(fit, test));
  }
  if (name == "series_stagnant") {
    return fmt::format("the water passes {}, and beside them {}, exchanging {} in all",
                       tanks_words(fit), still_words(fit, test), exchange_words(fit, test));
  }
  if (name == "plug_tank") {
    return fmt::format(
        "the water passes <b>{}</b> of the volume in use without mixing, then a mixed tank; in use "
        "are {}",
        percent(fit, "plug_fraction"), volume_words(fit, test));
  }
  if (name == "parallel_paths") {
    return fmt::format(
        "<b>{}</b> of the flow takes a fast path through <b>{}</b> of the volume in use, the rest "
        "a slow one; in use are {}",
        percent(fit, "fast_flow_fraction"), percent(fit, "fast_volume_fraction"),
        volume_words(fit, test));
  }
  if (name == "dispersion") {
    return fmt::format(
        "the water passes {} with axial dispersion, Peclet number <b>{}</b> (0: one mixed tank; "
        "large: plug flow)",
        volume_words(fit, test), interval_in_words(parameter(fit, "peclet"), 1.0, ""));
  }
  return listed(fit);
}

std::string prose(const std::string& sentence) {
  std::string html = html_escaped(sentence);
  for (const auto& [plain, printed] :
       {std::pair{" m3", " m\u00B3"}, std::pair{"/m3", "/m\u00B3"}, std::pair{"+-", "\u00B1"}}) {
    const std::string from = plain;
    for (auto at = html.find(from); at != std::string::npos; at = html.find(from, at + 1)) {
      html.replace(at, from.size(), printed);
    }
  }
  return html;
}

std::string prose_list(const std::vector<std::string>& sentences) {
  std::string html = "<ul>";
  for (const std::string& sentence : sentences) html += "<li>" + prose(sentence) + "</li>";
  return html + "</ul>\n";
}

std::string with_error(double value, double error, const std::string& unit) {
  if (!std::isfinite(error) || !(error > 0.0) || !std::isfinite(value)) {
    return joined(brief(value, 3), std::isfinite(value) ? unit : "");
  }
  const int decimals = std::clamp(1 - static_cast<int>(std::floor(std::log10(error))), 0, 8);
  return joined(fmt::format("{}{:.{}f} \u00B1 {:.{}f}", value < 0.0 ? "\u2212" : "",
                            std::fabs(value), decimals, error, decimals),
                unit);
}

}  // namespace stillzone::cli
