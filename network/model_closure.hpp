#pragma once

#include <array>
#include <cstddef>
#include <span>
#include <vector>

#include "kinetics/zone_kinetics.hpp"
#include "network/case.hpp"
#include "network/ledger.hpp"
#include "network/state_layout.hpp"

namespace stillzone::network {

/// What the processes of a model themselves create (or destroy, < 0) of what should be conserved:
///   made = sum_z V_z (sum_i content_i source_i + sum_g content_g transfer_g)
/// Some published models do not close; the audit of a run then shows how much, and its closure
/// error stays that of the computation.
class ModelClosure {
 public:
  /// Tries the model at states around its seed; what closes there to 1e-12 of the turnover is
  /// taken to close (a stoichiometry that does is 0 up to rounding at every state).
  ModelClosure(const Case& the_case, const StateLayout& layout, const Ledger& ledger,
               kinetics::ZoneKinetics& kinetics);

  [[nodiscard]] bool closes(Conserved what) const {
    return closes_[static_cast<std::size_t>(what)];
  }
  [[nodiscard]] bool closes_all() const;

  using Amounts = std::array<double, kConserved.size()>;
  /// [kg or kmol per d] in all zones. Arrays as of ZoneKinetics::rates; 0 where the model closes.
  [[nodiscard]] Amounts made(std::span<const double> source,
                             std::span<const double> transfer) const;
  /// The same along a direction: source and transfer replaced by their derivatives along it.
  /// @param jacobian of ZoneKinetics::jacobian
  /// @param v direction, n_zones * n_zone_unknowns; gas_v: of each zone's gases
  [[nodiscard]] Amounts made_along(std::span<const kinetics::KineticEntry> pattern,
                                   std::span<const double> jacobian, std::span<const double> v,
                                   std::span<const double> gas_v) const;

 private:
  [[nodiscard]] double weight(Conserved what, std::size_t row) const;

  StateLayout layout_;
  const Ledger& ledger_;
  std::vector<double> volume_;
  std::array<bool, kConserved.size()> closes_{};
};

}  // namespace stillzone::network
