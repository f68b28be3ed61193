#include "cli/run_tables.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <vector>

#include "cli/text_table.hpp"

namespace stillzone::cli {
namespace {

using network::NamedValue;
using network::PlaceState;

const NamedValue* find(const std::vector<NamedValue>& values, const std::string& name) {
  for (const NamedValue& value : values) {
    if (value.name == name) return &value;
  }
  return nullptr;
}

/// What a reader wants first of a zone: its implicit unknowns (pH), the first derived quantities of
/// the model, then its microbial groups; of a small model everything. The rest is in summary.json.
std::vector<std::string> shown_quantities(const network::Case& the_case, const PlaceState& zone) {
  constexpr std::size_t kSmall = 8;
  std::vector<std::string> names;
  const auto& model = the_case.kinetics;
  for (const auto& implicit : model.implicits) names.push_back(implicit.name);
  if (model.components.size() <= kSmall) {
    for (const auto& component : model.components) names.push_back(component.name);
  }
  constexpr std::size_t kDerived = 7;
  for (std::size_t k = 0; k < std::min(kDerived, zone.derived.size()); ++k) {
    names.push_back(zone.derived[k].name);
  }
  for (const auto& group : model.groups) {
    if (model.components.size() > kSmall) names.push_back(model.components[group.component].name);
  }
  return names;
}

/// Places down, quantities across, wrapped into blocks that fit a terminal.
std::string place_table(const network::Case& the_case, const std::vector<PlaceState>& places,
                        const std::string& kind) {
  constexpr std::size_t kColumns = 8;
  std::string text;
  if (places.empty()) return text;
  const auto names = shown_quantities(the_case, places.front());
  for (std::size_t first = 0; first < names.size(); first += kColumns) {
    const std::size_t last = std::min(first + kColumns, names.size());
    TextTable table;
    table.column(kind, TextTable::Align::left);
    for (std::size_t k = first; k < last; ++k) {
      const NamedValue* value = find(places.front().state, names[k]);
      if (value == nullptr) value = find(places.front().derived, names[k]);
      const std::string unit = value != nullptr ? value->unit : "";
      table.column(unit.empty() || unit == "1" || unit == "-"
                       ? names[k]
                       : fmt::format("{} [{}]", names[k], unit));
    }
    for (const PlaceState& place : places) {
      std::vector<std::string> row = {place.place};
      for (std::size_t k = first; k < last; ++k) {
        const NamedValue* value = find(place.state, names[k]);
        if (value == nullptr) value = find(place.derived, names[k]);
        row.push_back(value != nullptr ? short_number(value->value) : "-");
      }
      table.row(row);
    }
    text += table.text() + (last < names.size() ? "\n" : "");
  }
  return text;
}

std::string headspace_table(const network::RunResult& result) {
  TextTable table;
  table.column("headspace", TextTable::Align::left);
  table.column("pressure [bar]");
  table.column("gas, wet [m3/d]");
  table.column("gas, dry normal [m3/d]");
  table.column("methane, normal [m3/d]");
  table.column("methane of dry gas");
  table.column("pipe", TextTable::Align::left);
  for (const auto& space : result.headspaces) {
    table.row({space.name, fmt::format("{:.4f}", space.pressure), short_number(space.gas_flow),
               short_number(space.gas_flow_normal_dry), short_number(space.methane_flow_normal),
               percent(space.methane_share_dry), space.pipe_open ? "open" : "closed"});
  }
  return table.text();
}

std::string mean_gas_table(const network::RunResult& result) {
  TextTable table;
  table.column("headspace", TextTable::Align::left);
  table.column("gas, wet [m3/d]");
  table.column("gas, dry normal [m3/d]");
  table.column("methane, normal [m3/d]");
  for (const auto& space : result.headspaces) {
    table.row({space.name, short_number(space.mean_gas_flow),
               short_number(space.mean_gas_flow_normal_dry),
               short_number(space.mean_methane_flow_normal)});
  }
  return table.text();
}

std::string balance_table(const network::RunResult& result) {
  TextTable table;
  table.column("balance", TextTable::Align::left);
  table.column("in");
  table.column("out with water");
  table.column("out with gas");
  table.column("stored");
  table.column("unit", TextTable::Align::left);
  table.column("relative error");
  for (const auto& balance : result.balances) {
    table.row({balance.name, short_number(balance.inflow), short_number(balance.liquid_out),
               short_number(balance.gas_out), short_number(balance.stored_change), balance.unit,
               fmt::format("{:.1e}", balance.relative_error)});
  }
  return table.text();
}

}  // namespace

std::string run_tables(const network::Case& the_case, const network::RunResult& result) {
  std::string text = fmt::format("{} ({}{})\n\n", the_case.title, result.kind,
                                 result.kind == "steady"
                                     ? std::string()
                                     : fmt::format(", state at {} d", short_number(result.until)));
  const bool steady = result.kind == "steady";
  const std::string when = steady ? "" : fmt::format(" at {} d", short_number(result.until));
  text += "Zones" + when + "\n" + place_table(the_case, result.zones, "zone");
  std::vector<PlaceState> outlets;
  for (const auto& outlet : result.outlets) outlets.push_back(outlet.state);
  text += "\nOutlets" + when + "\n" + place_table(the_case, outlets, "outlet");
  if (!result.headspaces.empty()) {
    text += "\nGas" + when + "\n" + headspace_table(result);
    if (!steady) {
      text += fmt::format("\nGas, mean over the {}\n", result.kind == "periodic" ? "cycle" : "run");
      text += mean_gas_table(result);
    }
  }
  text += fmt::format("\nBalances{}\n",
                      result.kind == "steady" ? " (per day)" : " (over the whole run)");
  text += balance_table(result);
  const auto& counts = result.solver;
  text += fmt::format("\n{} unknowns, {} steps, {} residual and {} Jacobian calls, {:.3g} s\n",
                      result.unknowns, counts.steps, counts.rate_calls, counts.jacobian_calls,
                      result.seconds);
  if (!counts.method.empty()) {
    const bool told_below = result.solution_note.rfind(counts.reason, 0) == 0;
    text += fmt::format("{}{}\n", counts.method, told_below ? "" : ": " + counts.reason);
  }
  if (!result.solution_note.empty()) text += result.solution_note + "\n";
  for (const std::string& warning : result.warnings) text += "warning: " + warning + "\n";
  return text;
}

}  // namespace stillzone::cli
