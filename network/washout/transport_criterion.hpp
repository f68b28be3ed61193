#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "network/digester_system.hpp"

namespace stillzone::network {

/// Zones beyond which dense eigenvalues are not worked out (the work grows with the cube).
inline constexpr std::size_t kMostZonesForEigenvalues = 600;

/// What water alone does to anything suspended in the zones: dc/dt = A c.
///   A_zz = -(outflow of z) / V_z,   A_zw = (flow from w to z) / V_z
struct TransportMatrix {
  std::size_t n = 0;
  std::vector<double> entries;  ///< [1/d] n x n, row after row
};
[[nodiscard]] TransportMatrix transport_matrix(const Case& the_case,
                                               std::span<const Stream> streams,
                                               std::span<const double> rates);

/// The net growth rate that a population needs to persist somewhere in the network: minus the
/// spectral abscissa of A [1/d]. Q/V in one mixed tank; 0 where some zone is never left.
[[nodiscard]] std::optional<double> washout_rate(const TransportMatrix& matrix);

/// A microbial group at a state.
struct GroupInvasion {
  /// Spectral abscissa of A + diag(net growth of each zone) [1/d]. Where the group lives at a
  /// steady state it is 0 (growth and losses balance; below 0 by what the feed brings in); where it
  /// is absent, > 0 means that a few cells would grow into a population, < 0 that they wash out.
  double rate = 0.0;
  std::vector<double> net_growth;  ///< [1/d] per zone: growth - decay of the group there
  std::vector<double> own_loss;    ///< [1/d] per zone: outflow / volume
  std::vector<double> biomass;     ///< concentration per zone, the component's unit
};

/// The group's own block of the exact Jacobian: the derivative of its rate in each zone by its own
/// concentration, all else (substrate, pH) held. For rates in proportion to the biomass that is
/// growth - decay; for a rate that is not (a crowding term) it is that of an added cell.
[[nodiscard]] std::optional<GroupInvasion> group_invasion(DigesterSystem& system,
                                                          const TransportMatrix& matrix,
                                                          std::span<const double> y,
                                                          std::size_t component);

}  // namespace stillzone::network
