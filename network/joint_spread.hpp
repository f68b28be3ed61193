#pragma once

#include <optional>
#include <string>
#include <vector>

#include "core/json_reader.hpp"

namespace stillzone::network {

/// Quantities whose spreads belong together, as a fit leaves them:
///   "joint_spread": {"quantities": ["/zones/core/volume", "/flows/2/flow"],
///                    "correlation": [[1, -0.6], [-0.6, 1]]}
/// Each must carry a normal "spread" of its own, which gives its standard deviation.
struct JointSpread {
  std::vector<std::string> quantities;  ///< JSON pointers, at least two, each once
  std::vector<double> correlation;      ///< row after row, symmetric, 1 on the diagonal
};

/// Reads "joint_spread" when it is there. Faults: unknown or repeated pointers, quantities without
/// a normal spread, a matrix of the wrong shape, not symmetric, beyond +-1, or that no set of
/// quantities can have (an eigenvalue below -1e-6).
/// @param free the case's free quantities, all read already
[[nodiscard]] std::optional<JointSpread> read_joint_spread(
    core::ObjectReader& root, const std::vector<core::FreeQuantity>& free);

}  // namespace stillzone::network
