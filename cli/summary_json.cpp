#include "cli/summary_json.hpp"

#include "cli/series_means.hpp"

namespace stillzone::cli {
namespace {

using core::Json;

Json values(const std::vector<network::NamedValue>& named) {
  Json object = Json::object();
  for (const network::NamedValue& value : named) object[value.name] = value.value;
  return object;
}

/// Time means of a place's states, from the recorded history; empty for a steady state.
Json means(const network::Series& series, const network::PlaceState& place) {
  Json object = Json::object();
  for (const auto* list : {&place.state, &place.derived}) {
    for (const network::NamedValue& value : *list) {
      const auto mean = series_mean(series, place.place, value.name);
      if (mean) object[value.name] = *mean;
    }
  }
  return object;
}

Json units(const std::vector<network::NamedValue>& named) {
  Json object = Json::object();
  for (const network::NamedValue& value : named) object[value.name] = value.unit;
  return object;
}

Json outlet(const network::OutletResult& result) {
  return {{"flow_m3_d", result.flow},
          {"state", values(result.state.state)},
          {"derived", values(result.state.derived)}};
}

Json headspace(const network::HeadspaceResult& result) {
  return {{"state", values(result.state.state)},
          {"derived", values(result.state.derived)},
          {"pressure_bar", result.pressure},
          {"gas_flow_m3_d", result.gas_flow},
          {"gas_flow_normal_dry_m3_d", result.gas_flow_normal_dry},
          {"methane_flow_normal_m3_d", result.methane_flow_normal},
          {"methane_share_dry", result.methane_share_dry},
          {"pipe_open", result.pipe_open},
          {"means",
           {{"gas_flow_m3_d", result.mean_gas_flow},
            {"gas_flow_normal_dry_m3_d", result.mean_gas_flow_normal_dry},
            {"methane_flow_normal_m3_d", result.mean_methane_flow_normal}}}};
}

Json balance_terms(const network::Balance& balance) {
  return {{"unit", balance.unit},
          {"in", balance.inflow},
          {"liquid_out", balance.liquid_out},
          {"gas_out", balance.gas_out},
          {"stored", balance.stored_change},
          {"made_by_model", balance.made},
          {"relative_error", balance.relative_error}};
}

Json solver(const network::RunResult& result) {
  const core::IntegratorCounts& counts = result.solver;
  return {{"unknowns", result.unknowns},
          {"method", counts.method},
          {"reason", counts.reason},
          {"linear_solver", counts.linear_solver},
          {"steps", counts.steps},
          {"rejected_steps", counts.rejected_steps},
          {"residual_calls", counts.rate_calls},
          {"jacobian_calls", counts.jacobian_calls},
          {"factorisations", counts.factorisations},
          {"solves", counts.solves},
          {"switches", counts.switches},
          {"seconds", result.seconds},
          {"ended", result.solution_note}};
}

}  // namespace

Json run_summary(const network::RunResult& result, const std::string& title) {
  Json summary;
  summary["stillzone"] = "summary/1";
  summary["version"] = STILLZONE_VERSION;
  summary["title"] = title;
  summary["kind"] = result.kind;
  summary["time_d"] = result.until;
  summary["states_are"] = result.kind == "steady" ? "the steady state"
                          : result.kind == "periodic"
                              ? "those at the start of a cycle; \"means\" are over the cycle"
                              : "those at time_d; \"means\" and flows are over the run";
  summary["zones"] = Json::object();
  for (const network::PlaceState& zone : result.zones) {
    summary["zones"][zone.place] = {{"state", values(zone.state)},
                                    {"derived", values(zone.derived)}};
    if (!result.series.time.empty()) {
      summary["zones"][zone.place]["means"] = means(result.series, zone);
    }
  }
  summary["outlets"] = Json::object();
  for (const auto& result_of : result.outlets)
    summary["outlets"][result_of.name] = outlet(result_of);
  summary["headspaces"] = Json::object();
  for (const auto& result_of : result.headspaces) {
    summary["headspaces"][result_of.name] = headspace(result_of);
  }
  summary["flows"] = Json::array();
  for (const network::FlowResult& flow : result.flows) {
    summary["flows"].push_back({{"from", flow.from}, {"to", flow.to}, {"flow_m3_d", flow.flow}});
  }
  summary["balances"] = Json::object();
  summary["balance_terms"] = Json::object();
  for (const network::Balance& balance : result.balances) {
    summary["balances"][balance.name] = balance.relative_error;
    summary["balance_terms"][balance.name] = balance_terms(balance);
  }
  summary["solver"] = solver(result);
  if (!result.zones.empty()) {
    Json all = units(result.zones.front().state);
    all.update(units(result.zones.front().derived));
    for (const auto& space : result.headspaces) all.update(units(space.state.state));
    summary["units"] = std::move(all);
  }
  summary["warnings"] = result.warnings;
  return summary;
}

}  // namespace stillzone::cli
