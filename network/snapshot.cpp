#include "network/snapshot.hpp"

#include <algorithm>
#include <compare>
#include <limits>
#include <utility>

namespace stillzone::network {

namespace {

constexpr double kNormalTemperature = 273.15;  // K
constexpr double kNormalPressure = 1.01325;    // bar

}  // namespace

SnapshotMaker::SnapshotMaker(const Case& the_case, DigesterSystem& system)
    : case_(the_case), system_(system), layout_(system.layout()) {
  kinetics::ZoneConditions outlet;
  outlet.temperature = the_case.temperature.value();
  if (!the_case.zones.empty()) outlet.temperature = the_case.zones.front().temperature.value();
  outlet.gas_temperature = outlet.temperature;
  for (const Zone& zone : the_case.zones) {
    if (std::is_neq(zone.temperature <=> the_case.zones.front().temperature)) {
      one_temperature_ = false;
    }
  }
  outlet_conditions_.assign(the_case.outlets.size(), outlet);
  outlets_ = std::make_unique<kinetics::ZoneKinetics>(the_case.kinetics, outlet_conditions_);
  for (std::size_t o = 0; o < the_case.outlets.size(); ++o) {
    for (const auto& implicit : the_case.kinetics.implicits) {
      outlet_implicits_.push_back(implicit.start);
    }
  }
}

Snapshot SnapshotMaker::at(std::span<const double> y, const OperatingPoint& point) {
  Snapshot snapshot;
  const std::size_t n_derived = case_.kinetics.derived.size();
  snapshot.zone_derived.resize(layout_.n_zones() * n_derived);
  system_.kinetics().derived(layout_.zones(y), snapshot.zone_derived);
  snapshot.feed_flow.assign(case_.feeds.size(), 0.0);
  const auto streams = system_.operation().balance().streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    if (streams[s].from.kind != Place::Kind::feed) continue;
    snapshot.feed_flow[streams[s].from.index] += point.rates[s];
  }
  mix_outlets(y, point, snapshot);
  for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
    snapshot.headspaces.push_back(headspace(y, h));
  }
  return snapshot;
}

void SnapshotMaker::mix_outlets(std::span<const double> y, const OperatingPoint& point,
                                Snapshot& snapshot) {
  const std::size_t n_outlets = case_.outlets.size();
  const std::size_t n = layout_.n_components();
  const auto streams = system_.operation().balance().streams();
  snapshot.outlet_flow.assign(n_outlets, 0.0);
  snapshot.outlet_state.assign(n_outlets * layout_.n_zone_unknowns(), 0.0);
  snapshot.outlet_derived.resize(n_outlets * case_.kinetics.derived.size());
  std::vector<double> n_streams(n_outlets, 0.0);
  for (std::size_t s = 0; s < streams.size(); ++s) {
    if (streams[s].to.kind != Place::Kind::outlet) continue;
    snapshot.outlet_flow[streams[s].to.index] += point.rates[s];
    n_streams[streams[s].to.index] += 1.0;
  }
  std::vector<double> temperature(n_outlets, 0.0);
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const auto& [from, to, flow] = streams[s];
    if (to.kind != Place::Kind::outlet) continue;
    const double total = snapshot.outlet_flow[to.index];
    const double weight = total > 0.0 ? point.rates[s] / total : 1.0 / n_streams[to.index];
    const bool from_zone = from.kind == Place::Kind::zone;
    const auto c = from_zone ? layout_.components(y, from.index) : point.feed(from.index, n);
    double* mixed = snapshot.outlet_state.data() + to.index * layout_.n_zone_unknowns();
    for (std::size_t i = 0; i < n; ++i) mixed[i] += weight * c[i];
    temperature[to.index] +=
        weight * (from_zone ? case_.zones[from.index].temperature : case_.temperature).value();
  }
  if (!one_temperature_) {
    for (std::size_t o = 0; o < n_outlets; ++o) {
      outlet_conditions_[o].temperature = temperature[o];
    }
    outlets_->set_conditions(outlet_conditions_);
  }
  const std::size_t n_implicits = layout_.n_implicits();
  const auto implicits = [&](std::size_t o) {
    return snapshot.outlet_state.begin() +
           static_cast<std::ptrdiff_t>(o * layout_.n_zone_unknowns() + n);
  };
  for (std::size_t o = 0; o < n_outlets; ++o) {
    std::copy_n(outlet_implicits_.begin() + static_cast<std::ptrdiff_t>(o * n_implicits),
                n_implicits, implicits(o));
  }
  if (!outlets_->solve_implicits(snapshot.outlet_state)) {
    for (std::size_t o = 0; o < n_outlets; ++o) {
      std::fill_n(implicits(o), n_implicits, std::numeric_limits<double>::quiet_NaN());
    }
  } else {
    for (std::size_t o = 0; o < n_outlets; ++o) {
      std::copy_n(implicits(o), n_implicits,
                  outlet_implicits_.begin() + static_cast<std::ptrdiff_t>(o * n_implicits));
    }
  }
  outlets_->derived(snapshot.outlet_state, snapshot.outlet_derived);
}

HeadspaceReading SnapshotMaker::headspace(std::span<const double> y, std::size_t index) const {
  const kinetics::KineticModel& model = case_.kinetics;
  const Headspace& headspace = case_.headspaces[index];
  const HeadspaceGas gas = system_.headspace_gas(y, index);
  const double temperature = headspace.temperature.value();
  const auto g = layout_.gases(y, index);
  HeadspaceReading reading;
  reading.pressure = gas.pressure;
  reading.vapour_pressure = model.vapour_pressure(temperature);
  double kmol = 0.0;  // per m3 of headspace, dry
  double kmol_methane = 0.0;
  for (std::size_t i = 0; i < g.size(); ++i) {
    const double amount = g[i] * model.gases[i].kmol_per_unit;
    reading.partial_pressure.push_back(amount * model.gas_constant * temperature);
    kmol += amount;
    if (model.gases[i].role == "methane") kmol_methane += amount;
  }
  const double normal_volume = model.gas_constant * kNormalTemperature / kNormalPressure;
  reading.flow = gas.flow * gas.pressure / headspace.pipe.back_pressure.value();
  reading.flow_normal_dry = gas.flow * kmol * normal_volume;
  reading.methane_flow_normal = gas.flow * kmol_methane * normal_volume;
  reading.methane_share_dry = kmol > 0.0 ? kmol_methane / kmol : 0.0;
  reading.pipe_open = gas.flow > 0.0;
  return reading;
}

}  // namespace stillzone::network
