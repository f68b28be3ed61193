#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "core/dae/sparse_pattern.hpp"
#include "network/flow_balance.hpp"
#include "network/operation.hpp"
#include "network/state_layout.hpp"

namespace stillzone::network {

/// What water carries into and out of zones of constant volume:
///   V_z dc_z/dt = sum(q_in c_from) - (sum q_out) c_z
/// Each stream takes out of one place exactly what it brings into the next, so that nothing is
/// created whatever the rates.
class Transport {
 public:
  Transport(const Case& the_case, std::span<const Stream> streams, const StateLayout& layout);

  /// New rates and feed states.
  void set(const OperatingPoint& point);

  /// Adds dc/dt [unit/m3/d] of every component to f (both n_unknowns).
  void add_rates(std::span<const double> y, std::span<double> f) const;

  /// Entries of the Jacobian that transport may fill.
  [[nodiscard]] std::vector<core::SparsePattern::Entry> entries() const;
  /// Looks up where entries() stand; once, before add_jacobian.
  void locate(const core::SparsePattern& pattern);
  /// Adds d(dc/dt)/dc, which does not depend on the state, at the positions of the pattern.
  void add_jacobian(std::span<double> values) const;

 private:
  /// All streams from one zone to another.
  struct Link {
    std::size_t from = 0;
    std::size_t to = 0;
    std::vector<std::size_t> streams;
    double rate = 0.0;                  ///< [m3/d]
    std::vector<std::size_t> position;  ///< in the pattern, one per component
  };

  StateLayout layout_;
  std::vector<Stream> streams_;
  std::vector<double> volume_;  ///< [m3] one per zone
  std::vector<Link> links_;
  std::vector<std::size_t> diagonal_;  ///< positions, n_zones * n_components
  std::vector<double> loss_;           ///< [m3/d] leaving each zone
  std::vector<double> fed_;            ///< [unit/d] n_zones * n_components from feeds
};

}  // namespace stillzone::network
