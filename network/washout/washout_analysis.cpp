#include "network/washout/washout_analysis.hpp"

#include <fmt/format.h>

#include <chrono>
#include <utility>

#include "core/json_document.hpp"
#include "network/washout/curve_values.hpp"
#include "network/washout/ideal_tank.hpp"
#include "network/washout/loaded_digester.hpp"

namespace stillzone::network {

namespace {

FlowBalance balance_of_ideal(const Case& ideal) {
  core::FaultList faults;
  const auto nothing = core::JsonDocument::parse("{}", "ideal tank", ".", faults);
  SZ_REQUIRE(nothing.has_value(), "empty document: {}", faults.text());
  auto balance = FlowBalance::solve(ideal, *nothing, faults);
  SZ_REQUIRE(balance.has_value(), "the ideal tank's flows: {}", faults.text());
  return *balance;
}

/// Today's groups of one digester, into `groups` by `take`.
template <class Take>
void look_at_groups(const Case& the_case, const FlowBalance& balance, const LoadCurve& curve,
                    std::vector<GroupWashout>& groups, Take take) {
  const auto flows = LoadFlows::of(the_case, balance);
  if (!curve.today || !flows) return;
  LoadedDigester loaded(the_case, balance, *flows);
  CurveValues values(the_case, loaded, 0);
  const auto matrix = transport_matrix(the_case, balance.streams(), loaded.point().rates);
  const auto& y = curve.today->y;
  const std::vector<bool> lives = values.living(y, 1.0);
  for (std::size_t g = 0; g < groups.size(); ++g) {
    take(groups[g],
         group_invasion(loaded.digester(), matrix, y, the_case.kinetics.groups[g].component),
         lives[g]);
  }
}

std::string load_text(const std::optional<double>& load) {
  return load ? fmt::format("{:.4g} times today's load", *load) : std::string("no load tried");
}

/// Share of COD removed on the healthy branch at a load, between two points of the curve.
std::optional<double> removed_at(const LoadCurve& curve, double load) {
  for (std::size_t k = 1; k < curve.points.size(); ++k) {
    const CurvePoint& a = curve.points[k - 1];
    const CurvePoint& b = curve.points[k];
    if (b.load <= a.load) break;  // past a fold
    if (load < a.load || load > b.load) continue;
    return a.cod_removed + (load - a.load) / (b.load - a.load) * (b.cod_removed - a.cod_removed);
  }
  return std::nullopt;
}

/// Where, above today's load, the network falls short of the ideal tank the most.
struct Shortfall {
  double load = 1.0;
  double network = 0.0;
  double ideal = 0.0;
};

std::optional<Shortfall> worst_shortfall(const LoadCurve& network, const LoadCurve& ideal) {
  constexpr double kWorthAWord = 0.005;
  std::optional<Shortfall> worst;
  double reached = 0.0;
  for (const CurvePoint& point : network.points) {
    if (point.load < reached) break;  // past the fold: states nobody will see
    reached = point.load;
    const auto tank = removed_at(ideal, point.load);
    if (point.load < 1.0 || !tank || *tank - point.cod_removed < kWorthAWord) continue;
    if (worst && *tank - point.cod_removed <= worst->ideal - worst->network) continue;
    worst = Shortfall{point.load, point.cod_removed, *tank};
  }
  return worst;
}

/// The trap of the transport criterion: a zone that exchanges little keeps cells that the flow
/// cannot reach, so that "washout" comes later while treatment is lost earlier.
void add_sheltering(Washout& washout) {
  const LoadCurve& network = washout.network;
  const LoadCurve& ideal = washout.ideal;
  const bool later = ideal.critical_load &&
                     (network.critical_load ? *network.critical_load > *ideal.critical_load * 1.001
                                            : network.end == CurveEnd::none);
  if (!later) return;
  std::string text = fmt::format(
      "The network keeps its microorganisms longer than the ideal tank (lost at {}, ideal tank at "
      "{}). This is no advantage of the poor mixing: zones that exchange little shelter biomass "
      "while the water that passes them is treated less and less.",
      load_text(network.critical_load), load_text(ideal.critical_load));
  if (const auto worst = worst_shortfall(network, ideal)) {
    text += fmt::format(
        " At {:.3g} times today's load the network removes {:.1f} % of the COD where the ideal "
        "tank "
        "removes {:.1f} %.",
        worst->load, 100.0 * worst->network, 100.0 * worst->ideal);
  }
  if (network.half_treatment_load) {
    text +=
        fmt::format(" Half of today's COD removal is lost at {} (ideal tank: at {}).",
                    load_text(network.half_treatment_load), load_text(ideal.half_treatment_load));
  }
  washout.cautions.push_back(std::move(text));
}

void add_cautions(Washout& washout) {
  const LoadCurve& network = washout.network;
  const LoadCurve& ideal = washout.ideal;
  add_sheltering(washout);
  const bool better =
      network.today && ideal.today && network.today->cod_removed > ideal.today->cod_removed + 1e-6;
  if (better) {
    washout.cautions.push_back(fmt::format(
        "At today's load the network removes {:.2f} % of the COD and the ideal tank {:.2f} %: "
        "zones "
        "one after another can treat better than one mixed tank, also with some short-circuiting. "
        "It says nothing about the margin.",
        100.0 * network.today->cod_removed, 100.0 * ideal.today->cod_removed));
  }
  washout.cautions.emplace_back(
      "A washout load is that of the model: its rates, temperature and feed, at a steady load. A "
      "digester fails earlier under pulses, toxins, cooling or a change of feed; keep a margin "
      "that "
      "experience with this plant supports, and watch VFA, alkalinity and gas, not the criterion "
      "alone.");
}

}  // namespace

core::Result<Washout> analyse_washout(
    const Case& the_case, const FlowBalance& balance, const CurveOptions& options,
    const std::function<void(double share, double load)>& progress) {
  const auto begin = std::chrono::steady_clock::now();
  Washout washout;
  for (const Zone& zone : the_case.zones) washout.zones.push_back(zone.name);
  for (const auto& group : the_case.kinetics.groups) {
    const auto& component = the_case.kinetics.components[group.component];
    GroupWashout entry;
    entry.name = group.name;
    entry.component = component.name;
    entry.unit = component.unit;
    washout.groups.push_back(std::move(entry));
  }
  Operation operation(the_case, balance, Operation::Mode::mean);
  washout.network_washout_rate =
      washout_rate(transport_matrix(the_case, balance.streams(), operation.at(0.0).rates));

  const Case ideal = ideal_tank(the_case);
  const FlowBalance ideal_balance = balance_of_ideal(ideal);
  Operation ideal_operation(ideal, ideal_balance, Operation::Mode::mean);
  washout.ideal_washout_rate =
      washout_rate(transport_matrix(ideal, ideal_balance.streams(), ideal_operation.at(0.0).rates))
          .value_or(0.0);

  CurveOptions curve_options = options;
  if (progress) curve_options.progress = [&](double load) { progress(0.3, load); };
  auto network = trace_load_curve(the_case, balance, curve_options);
  if (!network) return network.failure();
  washout.network = std::move(network).value();
  if (progress) curve_options.progress = [&](double load) { progress(0.8, load); };
  auto tank = trace_load_curve(ideal, ideal_balance, curve_options);
  if (!tank) {
    core::Failure failure = tank.failure();
    failure.reason = "the ideal tank beside the network: " + failure.reason;
    return failure;
  }
  washout.ideal = std::move(tank).value();
  look_at_groups(the_case, balance, washout.network, washout.groups,
                 [](GroupWashout& group, std::optional<GroupInvasion> found, bool lives) {
                   group.in_network = std::move(found);
                   group.lives = lives;
                 });
  look_at_groups(ideal, ideal_balance, washout.ideal, washout.groups,
                 [](GroupWashout& group, std::optional<GroupInvasion> found, bool lives) {
                   group.in_ideal = std::move(found);
                   group.lives_in_ideal = lives;
                 });
  add_cautions(washout);
  washout.seconds = std::chrono::duration<double>(std::chrono::steady_clock::now() - begin).count();
  return washout;
}

}  // namespace stillzone::network
