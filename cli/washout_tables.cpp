#include "cli/washout_tables.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/text_table.hpp"
#include "cli/washout_summary.hpp"

namespace stillzone::cli {
namespace {

using network::CurvePoint;
using network::LoadCurve;

std::string load_cell(const std::optional<double>& load) {
  return load ? fmt::format("{:.6g}", *load) : "none";
}

std::string rate_cell(const std::optional<network::GroupInvasion>& found) {
  if (!found) return "n/a";
  return std::abs(found->rate) < 1e-9 ? "0" : short_number(found->rate);
}

std::string number_cell(double value) { return std::isfinite(value) ? short_number(value) : "-"; }

std::string criterion_text(const network::Washout& washout) {
  TextTable table;
  table.column("transport alone", TextTable::Align::left);
  table.column("washout rate [1/d]");
  table.column("washout SRT [d]");
  const auto row = [&](const char* name, const std::optional<double>& rate) {
    table.row({name, rate ? fmt::format("{:.6g}", *rate) : "not worked out",
               rate && *rate > 0.0 ? fmt::format("{:.6g}", 1.0 / *rate) : "-"});
  };
  row("network", washout.network_washout_rate);
  row("ideal tank", washout.ideal_washout_rate);
  return table.text() +
         "  A population needs at least this net growth rate somewhere to stay; it says nothing "
         "about treatment.\n";
}

std::string loads_text(const network::Case& the_case, const network::Washout& washout) {
  TextTable table;
  table.column("load", TextTable::Align::left);
  table.column("network");
  table.column("ideal tank");
  const auto& network = washout.network;
  const auto& ideal = washout.ideal;
  const auto name_of = [&](const LoadCurve& curve) {
    return curve.first_to_fail ? the_case.kinetics.groups[*curve.first_to_fail].name
                               : std::string("-");
  };
  const auto today = [](const LoadCurve& curve, double CurvePoint::*member) {
    return curve.today ? number_cell((*curve.today).*member) : std::string("-");
  };
  const auto recovery = [](const LoadCurve& curve) {
    if (!curve.today || !curve.today->recovery_rate) return std::string("not worked out");
    return short_number(*curve.today->recovery_rate);
  };
  table.row({"state today", network.today_is, ideal.today_is});
  table.row({"critical load (today = 1)", load_cell(network.critical_load),
             load_cell(ideal.critical_load)});
  table.row(
      {"a failed state stays possible down to load", return_cell(network), return_cell(ideal)});
  table.row({"first to fail", name_of(network), name_of(ideal)});
  if (network.sour_load || ideal.sour_load) {
    table.row({"effluent pH below 6.5 from load", load_cell(network.sour_load),
               load_cell(ideal.sour_load)});
  }
  table.row({"half of today's COD removal lost at", load_cell(network.half_treatment_load),
             load_cell(ideal.half_treatment_load)});
  if (!the_case.kinetics.gases.empty())
    table.row({"methane today [m3/d]", today(network, &CurvePoint::methane_flow),
               today(ideal, &CurvePoint::methane_flow)});
  if (!the_case.kinetics.vfa.empty())
    table.row({fmt::format("VFA today [{}]", vfa_unit(the_case)), today(network, &CurvePoint::vfa),
               today(ideal, &CurvePoint::vfa)});
  table.row({"effluent COD today [kg/m3]", today(network, &CurvePoint::effluent_cod),
             today(ideal, &CurvePoint::effluent_cod)});
  table.row({"recovery rate today [1/d]", recovery(network), recovery(ideal)});
  return table.text();
}

std::string groups_text(const network::Case& the_case, const network::Washout& washout) {
  if (washout.groups.empty()) return "";
  TextTable table;
  table.column("group", TextTable::Align::left);
  table.column("invasion [1/d]");
  table.column("in ideal tank");
  constexpr std::size_t kMostZones = 6;
  const std::size_t shown = std::min(washout.zones.size(), kMostZones);
  for (std::size_t z = 0; z < shown; ++z) table.column(washout.zones[z]);
  for (const auto& group : washout.groups) {
    std::vector<std::string> row{group.name, rate_cell(group.in_network),
                                 rate_cell(group.in_ideal)};
    for (std::size_t z = 0; z < shown; ++z) row.push_back(life_in_zone(the_case, group, z));
    table.row(std::move(row));
  }
  std::string text =
      table.text() +
      "  Invasion rate at today's state: 0 where the group lives (growth = losses; below 0 by what "
      "the feed brings),\n  > 0: absent but it could live here, < 0: washed out. In a zone: "
      "\"sustains itself\" when net "
      "growth meets the\n  zone's whole outflow, \"grows\" when growth exceeds decay, \"carried "
      "in\" when it decays "
      "there.\n";
  if (shown < washout.zones.size()) text += "  More zones are in summary.json.\n";
  return text;
}

}  // namespace

std::string return_cell(const LoadCurve& curve) {
  if (curve.return_load) return fmt::format("{:.6g}", *curve.return_load);
  if (curve.end != network::CurveEnd::fold || curve.points.empty()) return "-";
  return fmt::format("below {:.3g}", curve.points.back().load);
}

std::string life_in_zone(const network::Case& the_case, const network::GroupWashout& group,
                         std::size_t zone) {
  if (!group.in_network) return "n/a";
  const auto& found = *group.in_network;
  const auto component = the_case.kinetics.component(group.component);
  const double floor = component ? the_case.kinetics.components[*component].floor : 0.0;
  if (found.biomass[zone] <= floor || !group.lives) return "absent";
  if (!(found.net_growth[zone] > 0.0)) return "carried in";
  return found.net_growth[zone] < found.own_loss[zone] * (1.0 - 1e-6) ? "grows" : "sustains itself";
}

std::vector<std::string> washout_answer(const network::Case& the_case,
                                        const network::Washout& washout) {
  std::vector<std::string> answer;
  const LoadCurve& network = washout.network;
  answer.push_back(fmt::format("Today the network is {}, the ideal tank of the same volume {}.",
                               network.today_is, washout.ideal.today_is));
  const auto sentence = [&](const char* who, const LoadCurve& curve) {
    const std::string souring =
        curve.sour_load
            ? fmt::format("; its effluent is below pH 6.5 from load {:.4g} on", *curve.sour_load)
            : std::string();
    if (!curve.critical_load) return fmt::format("{}: {}{}.", who, end_of_curve(curve), souring);
    std::string text = fmt::format("{}: critical load {:.4g} of today's, margin {:+.3g} %; {}", who,
                                   *curve.critical_load, 100.0 * (*curve.critical_load - 1.0),
                                   end_of_curve(curve));
    if (curve.first_to_fail) {
      text +=
          fmt::format("; first to fail: {}", the_case.kinetics.groups[*curve.first_to_fail].name);
    }
    if (!curve.state_beyond.empty()) text += "; beyond it the digester is " + curve.state_beyond;
    return text + souring + ".";
  };
  answer.push_back(sentence("Network", network));
  answer.push_back(sentence("Ideal tank", washout.ideal));
  if (network.today && network.today->recovery_rate && *network.today->recovery_rate > 0.0) {
    answer.push_back(fmt::format(
        "At today's load a small disturbance of the network dies out at {:.3g} 1/d (ideal tank "
        "{}).",
        *network.today->recovery_rate,
        washout.ideal.today && washout.ideal.today->recovery_rate
            ? fmt::format("{:.3g} 1/d", *washout.ideal.today->recovery_rate)
            : "not worked out"));
  }
  return answer;
}

std::string washout_tables(const network::Case& the_case, const network::Washout& washout) {
  std::string text = the_case.title + "\n\n";
  for (const std::string& sentence : washout_answer(the_case, washout)) text += sentence + "\n";
  text += "\n" + criterion_text(washout) + "\n" + loads_text(the_case, washout) + "\n" +
          groups_text(the_case, washout) + "\n";
  for (const std::string& caution : washout.cautions) text += "! " + caution + "\n";
  for (const std::string& note : washout.network.notes) text += "Network: " + note + ".\n";
  for (std::size_t k = 1; k < washout.ideal.notes.size(); ++k) {
    text += "Ideal tank: " + washout.ideal.notes[k] + ".\n";
  }
  return text + fmt::format("Worked out in {:.2g} s.\n", washout.seconds);
}

}  // namespace stillzone::cli
