#include "network/model_closure.hpp"

#include <algorithm>
#include <cmath>
#include <cstdint>

namespace stillzone::network {

namespace {

constexpr double kClosed = 1e-12;
constexpr int kTrials = 4;

/// Factors between 0.3 and 3 without a pattern, the same in every run (a linear congruence with
/// the constants of Knuth, The Art of Computer Programming, vol. 2, 3.3.4, line 26).
class Scatter {
 public:
  double next() {
    state_ = 6364136223846793005U * state_ + 1442695040888963407U;
    const double unit = static_cast<double>(state_ >> 11U) / 9007199254740992.0;
    return 0.3 * std::pow(10.0, unit);
  }

 private:
  std::uint64_t state_ = 1;
};

}  // namespace

ModelClosure::ModelClosure(const Case& the_case, const StateLayout& layout, const Ledger& ledger,
                           kinetics::ZoneKinetics& kinetics)
    : layout_(layout), ledger_(ledger) {
  for (const Zone& zone : the_case.zones) volume_.push_back(zone.volume.value());
  closes_.fill(true);
  const kinetics::KineticModel& model = the_case.kinetics;
  const std::size_t n_zones = layout.n_zones();
  std::vector<double> unknowns(n_zones * layout.n_zone_unknowns());
  std::vector<double> gases(n_zones * layout.n_gases());
  std::vector<double> source(unknowns.size());
  std::vector<double> transfer(gases.size());
  Scatter scatter;
  for (int trial = 0; trial < kTrials; ++trial) {
    for (std::size_t z = 0; z < n_zones; ++z) {
      double* zone = unknowns.data() + layout.in_zone(z, 0);
      for (const auto& component : model.components) {
        *zone++ = scatter.next() * (component.seed + 10.0 * component.floor);
      }
      for (const auto& implicit : model.implicits) *zone++ = implicit.start;
      for (std::size_t g = 0; g < layout.n_gases(); ++g) {
        gases[z * layout.n_gases() + g] = scatter.next() * model.gases[g].seed;
      }
    }
    kinetics.rates(unknowns, gases, source, transfer);
    for (const Conserved what : kConserved) {
      double sum = 0.0;
      double turnover = 0.0;
      const auto add = [&](double amount) {
        sum += amount;
        turnover += std::abs(amount);
      };
      for (std::size_t z = 0; z < n_zones; ++z) {
        for (std::size_t i = 0; i < layout.n_components(); ++i) {
          add(ledger.content(what)[i] * source[layout.in_zone(z, i)]);
        }
        for (std::size_t g = 0; g < layout.n_gases(); ++g) {
          add(ledger.gas_content(what)[g] * transfer[z * layout.n_gases() + g]);
        }
      }
      if (!(std::abs(sum) <= kClosed * turnover)) closes_[static_cast<std::size_t>(what)] = false;
    }
  }
}

bool ModelClosure::closes_all() const {
  return std::ranges::all_of(closes_, [](bool closes) { return closes; });
}

/// Content of row `row` of the kinetics (components, implicit equations, transfers).
double ModelClosure::weight(Conserved what, std::size_t row) const {
  if (row < layout_.n_components()) return ledger_.content(what)[row];
  if (row < layout_.n_zone_unknowns()) return 0.0;
  return ledger_.gas_content(what)[row - layout_.n_zone_unknowns()];
}

ModelClosure::Amounts ModelClosure::made(std::span<const double> source,
                                         std::span<const double> transfer) const {
  Amounts made{};
  const std::size_t n_gases = layout_.n_gases();
  for (const Conserved what : kConserved) {
    if (closes(what)) continue;
    double total = 0.0;
    for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
      double sum = 0.0;
      for (std::size_t i = 0; i < layout_.n_components(); ++i) {
        sum += ledger_.content(what)[i] * source[layout_.in_zone(z, i)];
      }
      for (std::size_t g = 0; g < n_gases; ++g) {
        sum += ledger_.gas_content(what)[g] * transfer[z * n_gases + g];
      }
      total += volume_[z] * sum;
    }
    made[static_cast<std::size_t>(what)] = total;
  }
  return made;
}

ModelClosure::Amounts ModelClosure::made_along(std::span<const kinetics::KineticEntry> pattern,
                                               std::span<const double> jacobian,
                                               std::span<const double> v,
                                               std::span<const double> gas_v) const {
  Amounts made{};
  const std::size_t n_unknowns = layout_.n_zone_unknowns();
  for (const Conserved what : kConserved) {
    if (closes(what)) continue;
    double total = 0.0;
    for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
      double sum = 0.0;
      for (std::size_t e = 0; e < pattern.size(); ++e) {
        const auto [row, column] = pattern[e];
        const double along = column < n_unknowns
                                 ? v[layout_.in_zone(z, column)]
                                 : gas_v[z * layout_.n_gases() + column - n_unknowns];
        sum += weight(what, row) * jacobian[z * pattern.size() + e] * along;
      }
      total += volume_[z] * sum;
    }
    made[static_cast<std::size_t>(what)] = total;
  }
  return made;
}

}  // namespace stillzone::network
