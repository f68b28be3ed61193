#include "network/ledger.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <string>

namespace stillzone::network {

namespace {

double part(const kinetics::Content& content, Conserved what) {
  switch (what) {
    case Conserved::cod:
      return content.cod;
    case Conserved::carbon:
      return content.carbon;
    case Conserved::nitrogen:
      return content.nitrogen;
  }
  core::throw_defect("conserved quantity is known", __FILE__, __LINE__, "");
}

double dot(std::span<const double> a, std::span<const double> b) {
  return std::inner_product(a.begin(), a.end(), b.begin(), 0.0);
}

std::size_t number(Conserved what) { return static_cast<std::size_t>(what); }

/// Of what went through and what lay there, the larger: the scale of a closure error.
double closure(const Balance& balance, double stored_before, double stored_after) {
  const double error =
      balance.inflow + balance.made - balance.liquid_out - balance.gas_out - balance.stored_change;
  const double scale =
      std::max({std::abs(balance.inflow), std::abs(balance.liquid_out), std::abs(balance.gas_out),
                std::abs(balance.made), std::abs(stored_before), std::abs(stored_after)});
  return scale > 0.0 ? std::abs(error) / scale : 0.0;
}

}  // namespace

Ledger::Ledger(const Case& the_case, std::span<const Stream> streams, const StateLayout& layout)
    : layout_(layout), streams_(streams.begin(), streams.end()), outflow_(layout.n_zones(), 0.0) {
  for (const Zone& zone : the_case.zones) volume_.push_back(zone.volume.value());
  for (const Headspace& headspace : the_case.headspaces) {
    headspace_volume_.push_back(headspace.volume.value());
  }
  for (const Conserved what : kConserved) {
    for (const auto& component : the_case.kinetics.components) {
      content_[number(what)].push_back(part(component.content, what));
    }
    for (const auto& gas : the_case.kinetics.gases) {
      gas_content_[number(what)].push_back(part(gas.content, what));
    }
  }
}

std::span<const double> Ledger::content(Conserved what) const { return content_[number(what)]; }
std::span<const double> Ledger::gas_content(Conserved what) const {
  return gas_content_[number(what)];
}

void Ledger::set(const OperatingPoint& point) {
  outflow_.assign(outflow_.size(), 0.0);
  inflow_.fill(0.0);
  bypass_.fill(0.0);
  water_in_ = 0.0;
  water_out_ = 0.0;
  for (std::size_t s = 0; s < streams_.size(); ++s) {
    const auto& [from, to, flow] = streams_[s];
    const double rate = point.rates[s];
    const bool out = to.kind == Place::Kind::outlet;
    if (out) water_out_ += rate;
    if (from.kind == Place::Kind::feed) {
      water_in_ += rate;
      const auto state = point.feed(from.index, layout_.n_components());
      for (const Conserved what : kConserved) {
        const double carried = rate * dot(content(what), state);
        inflow_[number(what)] += carried;
        if (out) bypass_[number(what)] += carried;
      }
    } else if (from.kind == Place::Kind::zone && out) {
      outflow_[from.index] += rate;
    }
  }
}

void Ledger::rates(std::span<const double> y, std::span<const double> pipe_flows,
                   std::span<double> g) const {
  SZ_REQUIRE(g.size() == n_entries(), "{} of {} entries", g.size(), n_entries());
  for (const Conserved what : kConserved) {
    double liquid = bypass_[number(what)];
    for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
      if (outflow_[z] > 0.0) liquid += outflow_[z] * dot(content(what), layout_.components(y, z));
    }
    double gas = 0.0;
    for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
      gas += pipe_flows[h] * dot(gas_content(what), layout_.gases(y, h));
    }
    g[at(what, Entry::inflow)] = inflow_[number(what)];
    g[at(what, Entry::liquid_out)] = liquid;
    g[at(what, Entry::gas_out)] = gas;
    g[at(what, Entry::made)] = 0.0;
  }
  g[kWaterIn] = water_in_;
  g[kWaterOut] = water_out_;
}

void Ledger::rates_along(std::span<const double> y, std::span<const double> v,
                         std::span<const double> pipe_flows,
                         std::span<const double> pipe_flows_along, std::span<double> gv) const {
  SZ_REQUIRE(gv.size() == n_entries(), "{} of {} entries", gv.size(), n_entries());
  std::ranges::fill(gv, 0.0);
  for (const Conserved what : kConserved) {
    double liquid = 0.0;
    for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
      if (outflow_[z] > 0.0) liquid += outflow_[z] * dot(content(what), layout_.components(v, z));
    }
    double gas = 0.0;
    for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
      gas += pipe_flows[h] * dot(gas_content(what), layout_.gases(v, h)) +
             pipe_flows_along[h] * dot(gas_content(what), layout_.gases(y, h));
    }
    gv[at(what, Entry::liquid_out)] = liquid;
    gv[at(what, Entry::gas_out)] = gas;
  }
}

double Ledger::stored(Conserved what, std::span<const double> y) const {
  double sum = 0.0;
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    sum += volume_[z] * dot(content(what), layout_.components(y, z));
  }
  for (std::size_t h = 0; h < layout_.n_headspaces(); ++h) {
    sum += headspace_volume_[h] * dot(gas_content(what), layout_.gases(y, h));
  }
  return sum;
}

std::vector<Balance> Ledger::balances(
    std::span<const double> entries, std::span<const double, kConserved.size()> stored_before,
    std::span<const double, kConserved.size()> stored_after) const {
  std::vector<Balance> balances;
  Balance water{.name = "water", .unit = "m3"};
  water.inflow = entries[kWaterIn];
  water.liquid_out = entries[kWaterOut];
  water.relative_error = closure(water, 0.0, 0.0);
  balances.push_back(water);
  constexpr std::array kNames = {"COD", "C", "N"};
  constexpr std::array kUnits = {"kg COD", "kmol C", "kmol N"};
  for (const Conserved what : kConserved) {
    const std::size_t k = number(what);
    Balance balance{.name = kNames[k], .unit = kUnits[k]};
    balance.inflow = entries[at(what, Entry::inflow)];
    balance.liquid_out = entries[at(what, Entry::liquid_out)];
    balance.gas_out = entries[at(what, Entry::gas_out)];
    balance.made = entries[at(what, Entry::made)];
    balance.stored_change = stored_after[k] - stored_before[k];
    balance.relative_error = closure(balance, stored_before[k], stored_after[k]);
    balances.push_back(balance);
  }
  return balances;
}

}  // namespace stillzone::network
