#include "network/digester_system.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "core/require.hpp"

namespace stillzone::network {

namespace {

std::vector<kinetics::ZoneConditions> conditions_of(const Case& the_case) {
  std::vector<kinetics::ZoneConditions> conditions;
  for (const Zone& zone : the_case.zones) {
    kinetics::ZoneConditions here;
    here.temperature = zone.temperature.value();
    here.gas_temperature = here.temperature;
    if (zone.gas) {
      here.gas_transfer = zone.gas->coefficient.value();
      here.gas_temperature = the_case.headspaces[zone.gas->to.value()].temperature.value();
    }
    conditions.push_back(here);
  }
  return conditions;
}

}  // namespace

DigesterSystem::DigesterSystem(const Case& the_case, const FlowBalance& balance,
                               const Options& options)
    : case_(the_case),
      layout_(the_case),
      width_(options.pipe_opening_width),
      operation_(the_case, balance, options.mode),
      kinetics_(the_case.kinetics, conditions_of(the_case)),
      transport_(the_case, balance.streams(), layout_),
      ledger_(the_case, balance.streams(), layout_),
      closure_(the_case, layout_, ledger_, kinetics_),
      gases_(layout_.n_zones() * layout_.n_gases()),
      transfer_(gases_.size()),
      kinetic_jacobian_(layout_.n_zones() * kinetics_.pattern().size()),
      flows_(layout_.n_headspaces()),
      flows_along_(layout_.n_headspaces()),
      source_(layout_.n_zones() * layout_.n_zone_unknowns()),
      gas_v_(gases_.size()) {
  SZ_REQUIRE(width_ > 0.0, "pipe opening width {}", width_);
  const kinetics::KineticModel& model = the_case.kinetics;
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    for (const auto& component : model.components) {
      differential_.push_back(1);
      floors_.push_back(component.floor);
    }
    for (std::size_t i = 0; i < layout_.n_implicits(); ++i) {
      differential_.push_back(0);
      floors_.push_back(1.0);  // of pH and its like, one unit
    }
  }
  for (const Headspace& headspace : the_case.headspaces) {
    const double temperature = headspace.temperature.value();
    vapour_.push_back(model.vapour_pressure(temperature));
    meters_.emplace_back(headspace, model, vapour_.back());
    for (const auto& gas : model.gases) {
      differential_.push_back(1);
      floors_.push_back(gas.floor);
      bar_per_unit_.push_back(gas.kmol_per_unit * model.gas_constant * temperature);
    }
  }
  build_pattern();
  locate_kinetics();
  transport_.locate(pattern_);
  enter(0.0);
}

// ---------------------------------------------------------------------------- right-hand side

/// Gases that each zone meets; where it meets none, the seed (any finite value does).
void DigesterSystem::gather_gases(std::span<const double> y, std::span<double> gases) const {
  const std::size_t n = layout_.n_gases();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    const auto& gas = case_.zones[z].gas;
    for (std::size_t g = 0; g < n; ++g) {
      gases[z * n + g] =
          gas ? y[layout_.in_headspace(gas->to.value(), g)] : case_.kinetics.gases[g].seed;
    }
  }
}

HeadspaceGas DigesterSystem::headspace_gas(std::span<const double> y, std::size_t headspace) const {
  const auto gases = layout_.gases(y, headspace);
  double pressure = vapour_[headspace];
  for (std::size_t g = 0; g < gases.size(); ++g) {
    pressure += gases[g] * bar_per_unit_[headspace * layout_.n_gases() + g];
  }
  const PipeFlow out = pipe_flow(case_.headspaces[headspace].pipe, pressure, width_);
  return {pressure, out.flow, out.by_pressure};
}

void DigesterSystem::rates(std::span<const double> y, std::span<double> f) {
  gather_gases(y, gases_);
  kinetics_.rates(layout_.zones(y), gases_, layout_.zones(f), transfer_);
  transport_.add_rates(y, f);
  const std::size_t n = layout_.n_gases();
  for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
    const double volume = case_.headspaces[h].volume.value();
    const double renewal = headspace_gas(y, h).flow / volume;
    const auto gases = layout_.gases(y, h);
    const auto change = layout_.gases(f, h);
    for (std::size_t g = 0; g < n; ++g) change[g] = -renewal * gases[g];
  }
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    const Zone& zone = case_.zones[z];
    if (!zone.gas) continue;
    const std::size_t h = zone.gas->to.value();
    const double ratio = zone.volume / case_.headspaces[h].volume;
    const auto change = layout_.gases(f, h);
    for (std::size_t g = 0; g < n; ++g) change[g] += ratio * transfer_[z * n + g];
  }
}

void DigesterSystem::enter(double t) { operate(operation_.at(t)); }

void DigesterSystem::operate(const OperatingPoint& point) {
  transport_.set(point);
  ledger_.set(point);
  kind_ = point.kind;
  transport_jacobian_.assign(static_cast<std::size_t>(pattern_.n_entries()), 0.0);
  transport_.add_jacobian(transport_jacobian_);
}

core::Result<core::Done> DigesterSystem::make_consistent(std::span<double> y) {
  if (layout_.n_implicits() == 0) return core::Done{};
  auto solved = kinetics_.solve_implicits(layout_.zones(y));
  if (solved) return solved;
  core::Failure failure = solved.failure();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    if (failure.place == fmt::format("zone number {}", z + 1)) {
      failure.place = "zone " + case_.zones[z].name;
      break;
    }
  }
  return failure;
}

std::string DigesterSystem::unknown_place(std::size_t i) const {
  const auto at = layout_.position(i);
  return at.in_zone ? "zone " + case_.zones[at.place].name
                    : "headspace " + case_.headspaces[at.place].name;
}

std::string DigesterSystem::unknown_quantity(std::size_t i) const {
  const auto at = layout_.position(i);
  const kinetics::KineticModel& model = case_.kinetics;
  if (!at.in_zone) return model.gases[at.item].name;
  if (at.item < layout_.n_components()) return model.components[at.item].name;
  return model.implicits[at.item - layout_.n_components()].name;
}

// ------------------------------------------------------------------------------------ Jacobian

void DigesterSystem::build_pattern() {
  auto entries = transport_.entries();
  const auto add = [&](std::size_t row, std::size_t column) {
    entries.push_back({static_cast<std::int64_t>(row), static_cast<std::int64_t>(column)});
  };
  const std::size_t n_unknowns = layout_.n_zone_unknowns();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    const auto& gas = case_.zones[z].gas;
    for (const auto& [row, column] : kinetics_.pattern()) {
      if (!gas && (row >= n_unknowns || column >= n_unknowns)) continue;
      const std::size_t h = gas ? gas->to.value() : 0;
      add(row < n_unknowns ? layout_.in_zone(z, row) : layout_.in_headspace(h, row - n_unknowns),
          column < n_unknowns ? layout_.in_zone(z, column)
                              : layout_.in_headspace(h, column - n_unknowns));
    }
  }
  for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
    for (std::size_t g = 0; g < layout_.n_gases(); ++g) {
      for (std::size_t by = 0; by < layout_.n_gases(); ++by) {
        add(layout_.in_headspace(h, g), layout_.in_headspace(h, by));
      }
    }
  }
  pattern_ =
      core::SparsePattern::of(static_cast<std::int64_t>(layout_.n_unknowns()), std::move(entries));
}

void DigesterSystem::locate_kinetics() {
  const auto find = [&](std::size_t row, std::size_t column) {
    const auto position =
        pattern_.find(static_cast<std::int64_t>(row), static_cast<std::int64_t>(column));
    SZ_REQUIRE(position >= 0, "entry {}, {} is not in the pattern", row, column);
    return static_cast<std::size_t>(position);
  };
  const std::size_t n_unknowns = layout_.n_zone_unknowns();
  const auto kinetic = kinetics_.pattern();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    const Zone& zone = case_.zones[z];
    for (std::size_t e = 0; e < kinetic.size(); ++e) {
      const auto [row, column] = kinetic[e];
      if (!zone.gas && (row >= n_unknowns || column >= n_unknowns)) continue;
      const std::size_t h = zone.gas ? zone.gas->to.value() : 0;
      const std::size_t at = column < n_unknowns ? layout_.in_zone(z, column)
                                                 : layout_.in_headspace(h, column - n_unknowns);
      const std::size_t entry = z * kinetic.size() + e;
      if (row < n_unknowns) {
        in_zones_.push_back({entry, find(layout_.in_zone(z, row), at)});
      } else {
        in_headspaces_.push_back({entry, find(layout_.in_headspace(h, row - n_unknowns), at),
                                  zone.volume / case_.headspaces[h].volume});
      }
    }
  }
  for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
    for (std::size_t g = 0; g < layout_.n_gases(); ++g) {
      for (std::size_t by = 0; by < layout_.n_gases(); ++by) {
        pipe_positions_.push_back(find(layout_.in_headspace(h, g), layout_.in_headspace(h, by)));
      }
    }
  }
}

void DigesterSystem::jacobian(std::span<const double> y, std::span<double> values) {
  gather_gases(y, gases_);
  made_at_.clear();
  kinetics_.jacobian(layout_.zones(y), gases_, kinetic_jacobian_);
  std::ranges::copy(transport_jacobian_, values.begin());
  for (const auto& [entry, position] : in_zones_) values[position] += kinetic_jacobian_[entry];
  for (const auto& [entry, position, weight] : in_headspaces_) {
    values[position] += weight * kinetic_jacobian_[entry];
  }
  add_pipe_jacobian(y, values);
}

/// d(-g q(P) / V) / dg'
void DigesterSystem::add_pipe_jacobian(std::span<const double> y, std::span<double> values) const {
  const std::size_t n = layout_.n_gases();
  const std::size_t* position = pipe_positions_.data();
  for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
    const double volume = case_.headspaces[h].volume.value();
    const HeadspaceGas gas = headspace_gas(y, h);
    const auto g = layout_.gases(y, h);
    for (std::size_t i = 0; i < n; ++i) {
      for (std::size_t by = 0; by < n; ++by) {
        const double flow_by = gas.by_pressure * bar_per_unit_[h * n + by];
        values[*position++] -= (g[i] * flow_by + (i == by ? gas.flow : 0.0)) / volume;
      }
    }
  }
}

// --------------------------------------------------------------------------------- quadratures

/// Where a headspace's meter stands among the quadratures.
std::span<double> DigesterSystem::meter_readings(std::span<double> g, std::size_t headspace) {
  return g.subspan(Ledger::n_entries() + GasMeter::kReadings * headspace, GasMeter::kReadings);
}

void DigesterSystem::pipe_flows(std::span<const double> y) {
  for (std::size_t h = 0; h < flows_.size(); ++h) flows_[h] = headspace_gas(y, h).flow;
}

void DigesterSystem::quadrature_rates(std::span<const double> y, std::span<double> g) {
  pipe_flows(y);
  ledger_.rates(y, flows_, g.first(Ledger::n_entries()));
  for (std::size_t h = 0; h < meters_.size(); ++h) {
    const auto read =
        meters_[h].flows(layout_.gases(y, h), headspace_gas(y, h).pressure, flows_[h]);
    std::ranges::copy(read, meter_readings(g, h).begin());
  }
  if (closure_.closes_all()) return;
  gather_gases(y, gases_);
  kinetics_.rates(layout_.zones(y), gases_, source_, transfer_);
  const auto made = closure_.made(source_, transfer_);
  for (const Conserved what : kConserved) {
    g[Ledger::at(what, Ledger::Entry::made)] = made[static_cast<std::size_t>(what)];
  }
}

void DigesterSystem::quadrature_rates_along(std::span<const double> y, std::span<const double> v,
                                            std::span<double> gv) {
  const std::size_t n = layout_.n_gases();
  for (std::size_t h = 0; h < flows_.size(); ++h) {
    const HeadspaceGas gas = headspace_gas(y, h);
    double pressure_along = 0.0;
    for (std::size_t g = 0; g < n; ++g) {
      pressure_along += bar_per_unit_[h * n + g] * v[layout_.in_headspace(h, g)];
    }
    flows_[h] = gas.flow;
    flows_along_[h] = gas.by_pressure * pressure_along;
    const auto read = meters_[h].flows_along(layout_.gases(y, h), layout_.gases(v, h), gas.pressure,
                                             pressure_along, flows_[h], flows_along_[h]);
    std::ranges::copy(read, meter_readings(gv, h).begin());
  }
  ledger_.rates_along(y, v, flows_, flows_along_, gv.first(Ledger::n_entries()));
  if (closure_.closes_all()) return;
  if (!std::ranges::equal(made_at_, y)) {
    gather_gases(y, gases_);
    kinetics_.jacobian(layout_.zones(y), gases_, kinetic_jacobian_);
    made_at_.assign(y.begin(), y.end());
  }
  gather_gases(v, gas_v_);
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    if (case_.zones[z].gas) continue;
    for (std::size_t g = 0; g < n; ++g) gas_v_[z * n + g] = 0.0;
  }
  const auto made =
      closure_.made_along(kinetics_.pattern(), kinetic_jacobian_, layout_.zones(v), gas_v_);
  for (const Conserved what : kConserved) {
    gv[Ledger::at(what, Ledger::Entry::made)] = made[static_cast<std::size_t>(what)];
  }
}

}  // namespace stillzone::network
