#include "network/tracer/emitted_case.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <vector>

#include "network/tracer/zone_layout.hpp"

namespace stillzone::network {
namespace {

using Number = ZoneLayout::Number;

/// Gas transfer of an emitted zone: usual order for a mixed zone, a tenth where nothing moves
/// (assumed, no source).
constexpr double kMixedTransfer = 200.0;
constexpr double kStillTransfer = 20.0;

/// An emitted quantity with what the fit says of it.
struct Emitted {
  std::string pointer;
  Number number;
};

/// Variances and correlation of emitted quantities, by the fit's covariance.
class SpreadBook {
 public:
  explicit SpreadBook(const ModelFit& fit) : fit_(fit) {}

  /// g' C h over the model's parameters.
  [[nodiscard]] double covariance(const Number& a, const Number& b) const {
    const std::size_t n = fit_.parameters.size();
    double sum = 0.0;
    for (std::size_t i = 0; i < n_model(); ++i) {
      for (std::size_t j = 0; j < n_model(); ++j) {
        sum += a.d[i] * fit_.covariance[i * n + j] * b.d[j];
      }
    }
    return sum;
  }
  /// Standard deviation; 0 where the fit gives none.
  [[nodiscard]] double deviation(const Number& number) const {
    for (std::size_t j = 0; j < n_model(); ++j) {
      const bool moves = std::abs(number.d[j]) > 0.0;
      if (moves && std::isinf(fit_.parameters[j].standard_error)) return 0.0;
    }
    const double variance = covariance(number, number);
    return variance > 0.0 ? std::sqrt(variance) : 0.0;
  }
  /// The quantity as it stands in the case; remembered when it has a spread.
  std::string written(const std::string& pointer, const Number& number, const std::string& unit) {
    const auto with_unit = [&](double value) {
      return unit.empty() ? fmt::format("{:.8g}", value)
                          : fmt::format("\"{:.8g} {}\"", value, unit);
    };
    const double sd = deviation(number);
    if (!(sd > 0.0)) return with_unit(number.value);
    emitted_.push_back({pointer, number});
    return fmt::format("{{ \"value\": {}, \"spread\": {{ \"normal\": {} }} }}",
                       with_unit(number.value), with_unit(sd));
  }
  /// The "joint_spread" block; empty for fewer than two quantities.
  [[nodiscard]] std::string joint() const {
    if (emitted_.size() < 2) return {};
    std::string names;
    std::string rows;
    for (const Emitted& a : emitted_) {
      names += fmt::format("{}\"{}\"", names.empty() ? "" : ", ", a.pointer);
      std::string row;
      for (const Emitted& b : emitted_) {
        const double r =
            covariance(a.number, b.number) / (deviation(a.number) * deviation(b.number));
        const bool same = a.pointer == b.pointer;
        row += fmt::format("{}{:.10g}", row.empty() ? "" : ", ",
                           same ? 1.0 : std::clamp(r, -1.0, 1.0));
      }
      rows += fmt::format("{}[{}]", rows.empty() ? "" : ",\n      ", row);
    }
    return fmt::format(
        "  \"joint_spread\": {{\n    \"quantities\": [{}],\n    \"correlation\": [\n      {}\n    "
        "]\n  }},\n",
        names, rows);
  }

 private:
  [[nodiscard]] std::size_t n_model() const { return fit_.model_values().size(); }

  const ModelFit& fit_;
  std::vector<Emitted> emitted_;
};

std::string zones_text(const ZoneLayout& layout, SpreadBook& book) {
  std::string text;
  for (const ZoneLayout::Zone& zone : layout.zones) {
    text += fmt::format(
        "{}    \"{}\": {{ \"volume\": {},\n      \"gas\": {{ \"to\": \"dome\", \"kLa\": \"{} 1/d\" "
        "}} }}",
        text.empty() ? "" : ",\n", zone.name,
        book.written("/zones/" + zone.name + "/volume", zone.volume, "m3"),
        zone.still ? kStillTransfer : kMixedTransfer);
  }
  return text;
}

std::string flows_text(const ZoneLayout& layout, const std::string& feed, SpreadBook& book) {
  std::string text;
  for (std::size_t i = 0; i < layout.flows.size(); ++i) {
    const ZoneLayout::Flow& flow = layout.flows[i];
    const std::string from = flow.from == "feed" ? feed : flow.from;
    text += i == 0 ? "    { " : ",\n    { ";
    text += flow.exchange ? fmt::format("\"between\": [\"{}\", \"{}\"]", from, flow.to)
                          : fmt::format("\"from\": \"{}\", \"to\": \"{}\"", from, flow.to);
    if (flow.flow) {
      text += ", \"flow\": " + book.written(fmt::format("/flows/{}/flow", i), *flow.flow, "m3/d");
    }
    if (flow.share) {
      text += ", \"share\": " + book.written(fmt::format("/flows/{}/share", i), *flow.share, "");
    }
    text += " }";
  }
  return text;
}

/// A feed to be filled in: the test's flow and an invented sludge.
std::string invented_feed(double flow) {
  return fmt::format(
      "    // An invented mixed sludge: put your own in its place, in the units of adm1.\n"
      "    \"sludge\": {{ \"flow\": \"{:.8g} m3/d\",\n"
      "      \"state\": {{ \"X_ch\": 5.0, \"X_pr\": 20.0, \"X_li\": 5.0, \"X_I\": 25.0, \"X_c\": "
      "2.0,\n"
      "                 \"S_IN\": 0.01, \"S_IC\": 0.04, \"S_cat\": 0.04, \"S_an\": 0.02 }} }}",
      flow);
}

std::string indented(const core::Json& json, int by) {
  std::string text;
  for (const char c : json.dump(2)) {
    text += c;
    if (c == '\n') text.append(static_cast<std::size_t>(by), ' ');
  }
  return text;
}

std::string quoted(const std::string& text) { return core::Json(text).dump(); }

}  // namespace

core::Result<std::string> emitted_case(const TracerTest& test, const ModelFit& fit,
                                       const std::optional<EmittedFeed>& feed) {
  auto layout = zone_layout(fit, test.volume.value(), test.mean_flow.value());
  if (!layout) return layout.failure();
  SpreadBook book(fit);
  const std::string feed_name = feed ? feed->name : "sludge";
  const std::string zones = zones_text(layout.value(), book);
  const std::string flows = flows_text(layout.value(), feed_name, book);
  std::string text = "// Zone model of a tracer test: " + fit.name + ", " + fit.meaning + ".\n";
  for (const std::string& note : layout.value().notes) text += "// Note: " + note + ".\n";
  for (const FittedParameter& p : fit.parameters) {
    if (!p.identified && !p.verdict.empty()) {
      text += fmt::format("// {}: {}.\n", p.name, p.verdict);
    }
  }
  text += "// kLa, headspace and pipe are assumed; put the plant's own in their place.\n";
  text += "{\n  \"stillzone\": \"case/1\",\n";
  text += fmt::format("  \"title\": {},\n", quoted(test.title + ", " + fit.name));
  text += "  \"kinetics\": \"adm1\",\n  \"temperature\": \"35 degC\",\n  \"zones\": {\n" + zones +
          "\n  },\n";
  text += fmt::format(
      "  \"headspaces\": {{\n    \"dome\": {{ \"volume\": \"{:.4g} m3\",\n      \"pipe\": {{ "
      "\"coefficient\": \"5e4 m3/d/bar\", \"back_pressure\": \"1.013 bar\" }} }}\n  }},\n",
      0.1 * test.volume.value());
  text += "  \"feeds\": {\n" +
          (feed ? fmt::format("    {}: {}", quoted(feed->name), indented(feed->block, 4))
                : invented_feed(test.mean_flow.value())) +
          "\n  },\n";
  text += "  \"outlets\": [\"overflow\"],\n  \"flows\": [\n" + flows + "\n  ],\n";
  text += book.joint();
  text += "  \"run\": { \"kind\": \"steady\", \"start\": \"seeded\" }\n}\n";
  return text;
}

std::string emitted_network(const core::Json& user_case, const ModelFit& fit) {
  core::Json result = user_case;
  std::vector<std::size_t> spread;
  const std::size_t n = fit.parameters.size();
  for (std::size_t j = 0; j < n; ++j) {
    const FittedParameter& p = fit.parameters[j];
    if (p.name.empty() || p.name.front() != '/') continue;
    const auto with_unit = [&](double value) {
      return p.unit == "1" ? core::Json(value)
                           : core::Json(fmt::format("{:.8g} {}", value, p.unit));
    };
    core::Json& node = result[core::Json::json_pointer(p.name)];
    node = {{"value", with_unit(p.value)}};
    if (!std::isfinite(p.standard_error) || !(p.standard_error > 0.0)) continue;
    node["spread"] = {{"normal", with_unit(p.standard_error)}};
    spread.push_back(j);
  }
  if (spread.size() < 2) return result.dump(2) + "\n";
  core::Json names = core::Json::array();
  core::Json matrix = core::Json::array();
  for (const std::size_t a : spread) {
    names.push_back(fit.parameters[a].name);
    core::Json row = core::Json::array();
    for (const std::size_t b : spread) row.push_back(a == b ? 1.0 : fit.correlation[a * n + b]);
    matrix.push_back(std::move(row));
  }
  result["joint_spread"] = {{"quantities", names}, {"correlation", matrix}};
  return result.dump(2) + "\n";
}

}  // namespace stillzone::network
