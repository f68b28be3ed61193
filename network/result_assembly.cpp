#include "network/result_assembly.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <string>

namespace stillzone::network {

namespace {

PlaceState water_state(const kinetics::KineticModel& model, const std::string& place,
                       std::span<const double> unknowns, std::span<const double> derived) {
  PlaceState water;
  water.place = place;
  std::size_t i = 0;
  for (const auto& component : model.components) {
    water.state.push_back({component.name, component.unit, unknowns[i++]});
  }
  for (const auto& implicit : model.implicits) {
    water.state.push_back({implicit.name, implicit.unit, unknowns[i++]});
  }
  i = 0;
  for (const auto& quantity : model.derived) {
    water.derived.push_back({quantity.name, quantity.unit, derived[i++]});
  }
  return water;
}

HeadspaceResult headspace_result(const kinetics::KineticModel& model, const std::string& name,
                                 std::span<const double> gases, const HeadspaceReading& reading) {
  HeadspaceResult result;
  result.name = name;
  result.state.place = name;
  for (std::size_t g = 0; g < gases.size(); ++g) {
    const auto& gas = model.gases[g];
    result.state.state.push_back({gas.name, gas.unit, gases[g]});
    result.state.derived.push_back({"p_" + gas.name, "bar", reading.partial_pressure[g]});
  }
  result.state.derived.push_back({"p_water_vapour", "bar", reading.vapour_pressure});
  result.pressure = reading.pressure;
  result.gas_flow = reading.flow;
  result.gas_flow_normal_dry = reading.flow_normal_dry;
  result.methane_flow_normal = reading.methane_flow_normal;
  result.methane_share_dry = reading.methane_share_dry;
  result.pipe_open = reading.pipe_open;
  return result;
}

}  // namespace

void assemble_places(const Case& the_case, DigesterSystem& system, SnapshotMaker& snapshots,
                     std::span<const double> y, const OperatingPoint& point, RunResult& result) {
  const kinetics::KineticModel& model = the_case.kinetics;
  const StateLayout& layout = system.layout();
  const std::size_t n_unknowns = layout.n_zone_unknowns();
  const std::size_t n_derived = model.derived.size();
  const Snapshot snapshot = snapshots.at(y, point);
  for (std::size_t z = 0; z < layout.n_zones(); ++z) {
    result.zones.push_back(
        water_state(model, the_case.zones[z].name, layout.zone(y, z),
                    std::span(snapshot.zone_derived).subspan(z * n_derived, n_derived)));
  }
  for (std::size_t o = 0; o < the_case.outlets.size(); ++o) {
    const std::string& name = the_case.outlets[o].name;
    result.outlets.push_back(
        {name, snapshot.outlet_flow[o],
         water_state(model, name,
                     std::span(snapshot.outlet_state).subspan(o * n_unknowns, n_unknowns),
                     std::span(snapshot.outlet_derived).subspan(o * n_derived, n_derived))});
  }
  for (std::size_t h = 0; h < layout.n_headspaces(); ++h) {
    result.headspaces.push_back(headspace_result(model, the_case.headspaces[h].name,
                                                 layout.gases(y, h), snapshot.headspaces[h]));
  }
  const auto streams = system.operation().balance().streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    result.flows.push_back(
        {the_case.name_of(streams[s].from), the_case.name_of(streams[s].to), point.rates[s]});
  }
}

void assemble_warnings(const Case& the_case, const DigesterSystem& system,
                       std::span<const double> y, double tolerance, bool steady,
                       RunResult& result) {
  for (const Balance& balance : result.balances) {
    if (balance.relative_error <= std::max(1e-9, tolerance)) continue;
    result.warnings.push_back(fmt::format(
        "the balance of {} closes to {:.1e} only, worse than the tolerance {:g} explains",
        balance.name, balance.relative_error, tolerance));
  }
  const auto floors = system.floors();
  std::size_t worst = y.size();
  double worst_ratio = 10.0 * tolerance;
  for (std::size_t i = 0; i < y.size(); ++i) {
    if (system.differential()[i] == 0 || -y[i] <= worst_ratio * floors[i]) continue;
    worst_ratio = -y[i] / floors[i];
    worst = i;
  }
  if (worst < y.size()) {
    result.warnings.push_back(fmt::format(
        "{} is {:.3g} in {}: below 0 by more than the tolerance explains; try a tighter tolerance",
        system.unknown_quantity(worst), y[worst], system.unknown_place(worst)));
  }
  if (the_case.kinetics.gases.empty()) return;
  // Digesters run at some tens of mbar over the outside: common practice, no source.
  constexpr double kHighOverpressure = 0.3;  // bar
  for (std::size_t h = 0; h < result.headspaces.size(); ++h) {
    const double over =
        result.headspaces[h].pressure - the_case.headspaces[h].pipe.back_pressure.value();
    if (over <= kHighOverpressure) continue;
    result.warnings.push_back(fmt::format(
        "headspace \"{}\" stands {:.2g} bar over its back pressure: no digester cover bears that; "
        "check the pipe's coefficient and opening pressure",
        result.headspaces[h].name, over));
  }
  if (!steady) return;
  for (const HeadspaceResult& headspace : result.headspaces) {
    if (headspace.pipe_open) continue;
    result.warnings.push_back(
        fmt::format("no gas leaves headspace \"{}\": its pressure of {:.4g} bar does not open the "
                    "pipe",
                    headspace.name, headspace.pressure));
  }
}

std::string living_groups(const Case& the_case, const DigesterSystem& system,
                          std::span<const double> y, const OperatingPoint& point) {
  const kinetics::KineticModel& model = the_case.kinetics;
  const StateLayout& layout = system.layout();
  if (model.groups.empty()) return "";
  std::string washed_out;
  for (const kinetics::Group& group : model.groups) {
    double in = 0.0;
    double out = 0.0;
    const auto streams = system.operation().balance().streams();
    for (std::size_t s = 0; s < streams.size(); ++s) {
      const auto& [from, to, flow] = streams[s];
      const bool leaves = to.kind == Place::Kind::outlet;
      if (from.kind == Place::Kind::feed) {
        const double carried =
            point.rates[s] * point.feed(from.index, layout.n_components())[group.component];
        in += carried;
        if (leaves) out += carried;
      } else if (leaves) {
        out += point.rates[s] * layout.components(y, from.index)[group.component];
      }
    }
    const double floor = model.components[group.component].floor;
    const bool lives = out > in * (1.0 + 1e-6) && out > floor * 1e-6;
    if (!lives) washed_out += (washed_out.empty() ? "" : ", ") + group.name;
  }
  if (washed_out.empty()) return "every microbial group lives in it";
  return "washed out (not more of them leaves than is fed): " + washed_out;
}

}  // namespace stillzone::network
