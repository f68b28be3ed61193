#include "cli/washout_summary.hpp"

#include <fmt/format.h>

#include <cmath>

namespace stillzone::cli {
namespace {

using core::Json;
using network::CurveEnd;
using network::CurvePoint;
using network::LoadCurve;

Json number(double value) { return std::isfinite(value) ? Json(value) : Json(nullptr); }

template <class T>
Json maybe(const std::optional<T>& value) {
  return value ? Json(*value) : Json(nullptr);
}

Json point_json(const network::Case& the_case, const CurvePoint& point) {
  Json biomass = Json::object();
  for (std::size_t g = 0; g < point.biomass.size(); ++g) {
    biomass[the_case.kinetics.groups[g].name] = point.biomass[g];
  }
  return {{"load", point.load},
          {"hrt_d", point.hrt_d},
          {"methane_flow_m3_d", point.methane_flow},
          {"vfa", number(point.vfa)},
          {"pH", number(point.ph)},
          {"stable", maybe(point.stable)},
          {"recovery_rate_1_d", maybe(point.recovery_rate)},
          {"effluent_cod_kg_m3", number(point.effluent_cod)},
          {"cod_removed", number(point.cod_removed)},
          {"biomass", std::move(biomass)}};
}

Json points_json(const network::Case& the_case, const std::vector<CurvePoint>& points) {
  Json list = Json::array();
  for (const CurvePoint& point : points) list.push_back(point_json(the_case, point));
  return list;
}

const char* end_word(CurveEnd end) {
  switch (end) {
    case CurveEnd::fold:
      return "fold";
    case CurveEnd::washout:
      return "washout";
    case CurveEnd::given_up:
      return "given up";
    case CurveEnd::nothing_lives:
      return "nothing lives";
    case CurveEnd::none:
      break;
  }
  return "none up to the highest load";
}

Json curve_facts(const network::Case& the_case, const LoadCurve& curve) {
  Json facts;
  facts["end"] = end_word(curve.end);
  facts["critical_load"] = maybe(curve.critical_load);
  facts["margin"] = curve.critical_load ? Json(*curve.critical_load - 1.0) : Json(nullptr);
  facts["sour_load"] = maybe(curve.sour_load);
  facts["folds"] = curve.folds;
  facts["return_load"] = maybe(curve.return_load);
  facts["first_to_fail"] = curve.first_to_fail
                               ? Json(the_case.kinetics.groups[*curve.first_to_fail].name)
                               : Json(nullptr);
  facts["state_today"] = curve.today_is;
  facts["state_beyond"] = curve.state_beyond.empty() ? Json(nullptr) : Json(curve.state_beyond);
  facts["half_treatment_load"] = maybe(curve.half_treatment_load);
  facts["today"] = curve.today ? point_json(the_case, *curve.today) : Json(nullptr);
  facts["notes"] = curve.notes;
  return facts;
}

Json group_json(const network::GroupWashout& group, const std::vector<std::string>& zones) {
  Json entry;
  const auto rate = [](const std::optional<network::GroupInvasion>& found) {
    return found ? number(found->rate) : Json(nullptr);
  };
  entry["invasion_rate_1_d"] = rate(group.in_network);
  entry["ideal_invasion_rate_1_d"] = rate(group.in_ideal);
  entry["component"] = group.component;
  entry["unit"] = group.unit;
  entry["lives"] = group.lives;
  entry["lives_in_ideal"] = group.lives_in_ideal;
  entry["zones"] = Json::object();
  if (group.in_network) {
    for (std::size_t z = 0; z < zones.size(); ++z) {
      entry["zones"][zones[z]] = {{"net_growth_1_d", number(group.in_network->net_growth[z])},
                                  {"own_loss_1_d", number(group.in_network->own_loss[z])},
                                  {"biomass", number(group.in_network->biomass[z])}};
    }
  }
  return entry;
}

std::string cell(double value) { return std::isfinite(value) ? fmt::format("{}", value) : ""; }

void add_csv(std::string& csv, const char* digester, const char* branch,
             const std::vector<CurvePoint>& points) {
  for (const CurvePoint& p : points) {
    csv += fmt::format("{},{},{},{},{},{},{},{},{},{},{}", digester, branch, p.load, p.hrt_d,
                       p.methane_flow, cell(p.vfa), cell(p.ph), cell(p.effluent_cod),
                       cell(p.cod_removed), p.stable ? (*p.stable ? "yes" : "no") : "",
                       p.recovery_rate ? fmt::format("{}", *p.recovery_rate) : "");
    for (const double mean : p.biomass) csv += fmt::format(",{}", mean);
    csv += "\r\n";
  }
}

}  // namespace

std::string vfa_unit(const network::Case& the_case) {
  for (const auto& derived : the_case.kinetics.derived) {
    if (derived.name == the_case.kinetics.vfa) return derived.unit;
  }
  return "";
}

std::string end_of_curve(const LoadCurve& curve) {
  switch (curve.end) {
    case CurveEnd::fold:
      return "the healthy steady state ends there (a fold): failure is sudden";
    case CurveEnd::washout:
      return "a microbial group is washed out there";
    case CurveEnd::given_up:
      return "the curve could not be followed to its end";
    case CurveEnd::nothing_lives:
      return "no microbial group lives at any load tried";
    case CurveEnd::none:
      break;
  }
  return "not lost at any load tried";
}

Json washout_summary(const network::Case& the_case, const network::Washout& washout) {
  Json summary;
  summary["stillzone"] = "summary/1";
  summary["version"] = STILLZONE_VERSION;
  summary["title"] = the_case.title;
  summary["kind"] = "washout";
  summary["network_washout_rate_1_d"] = maybe(washout.network_washout_rate);
  summary["network_washout_srt_d"] =
      washout.network_washout_rate && *washout.network_washout_rate > 0.0
          ? Json(1.0 / *washout.network_washout_rate)
          : Json(nullptr);
  summary["ideal_washout_rate_1_d"] = washout.ideal_washout_rate;
  summary["ideal_washout_srt_d"] = number(1.0 / washout.ideal_washout_rate);
  summary["groups"] = Json::object();
  for (const auto& group : washout.groups) {
    summary["groups"][group.name] = group_json(group, washout.zones);
  }
  summary["critical_load"] = maybe(washout.network.critical_load);
  summary["ideal_critical_load"] = maybe(washout.ideal.critical_load);
  summary["first_to_fail"] =
      washout.network.first_to_fail
          ? Json(the_case.kinetics.groups[*washout.network.first_to_fail].name)
          : Json(nullptr);
  summary["vfa_unit"] = vfa_unit(the_case);
  summary["network"] = curve_facts(the_case, washout.network);
  summary["ideal"] = curve_facts(the_case, washout.ideal);
  summary["curve"] = points_json(the_case, washout.network.points);
  summary["curve_beyond"] = points_json(the_case, washout.network.beyond);
  summary["ideal_curve"] = points_json(the_case, washout.ideal.points);
  summary["ideal_curve_beyond"] = points_json(the_case, washout.ideal.beyond);
  summary["warnings"] = washout.cautions;
  summary["solver"] = {{"seconds", washout.seconds}};
  return summary;
}

std::string washout_curve_csv(const network::Case& the_case, const network::Washout& washout) {
  const std::string unit = vfa_unit(the_case);
  std::string csv = fmt::format(
      "digester,branch,load,hrt [d],methane_flow [m3/d],vfa [{}],pH,effluent_cod [kg "
      "COD/m3],cod_removed,stable,recovery_rate [1/d]",
      unit);
  for (const auto& group : the_case.kinetics.groups) {
    const auto& component = the_case.kinetics.components[group.component];
    csv += fmt::format(",mean {} [{}]", component.name, component.unit);
  }
  csv += "\r\n";
  add_csv(csv, "network", "main", washout.network.points);
  add_csv(csv, "network", "beyond", washout.network.beyond);
  add_csv(csv, "ideal", "main", washout.ideal.points);
  add_csv(csv, "ideal", "beyond", washout.ideal.beyond);
  return csv;
}

}  // namespace stillzone::cli
