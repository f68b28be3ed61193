#pragma once

#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "core/result.hpp"
#include "network/washout/load_curve.hpp"
#include "network/washout/transport_criterion.hpp"

namespace stillzone::network {

/// One microbial group, in the network and in the ideal tank beside it.
struct GroupWashout {
  std::string name;
  std::string component;
  std::string unit;
  std::optional<GroupInvasion> in_network;  ///< at today's state; none: not worked out
  std::optional<GroupInvasion> in_ideal;
  bool lives = false;  ///< in the network today
  bool lives_in_ideal = false;
};

struct Washout {
  std::optional<double> network_washout_rate;  ///< [1/d]
  double ideal_washout_rate = 0.0;             ///< [1/d] all feed flow over all volume
  std::vector<GroupWashout> groups;
  LoadCurve network;
  LoadCurve ideal;
  std::vector<std::string> zones;  ///< names
  /// Sentences that must stand beside the figures: what the criterion does not say.
  std::vector<std::string> cautions;
  double seconds = 0.0;
};

/// @param progress share done (rough), load reached
[[nodiscard]] core::Result<Washout> analyse_washout(
    const Case& the_case, const FlowBalance& balance, const CurveOptions& options,
    const std::function<void(double share, double load)>& progress);

}  // namespace stillzone::network
