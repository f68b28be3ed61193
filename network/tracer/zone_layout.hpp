#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "core/dual_number.hpp"
#include "core/result.hpp"
#include "network/tracer/model_fit.hpp"

namespace stillzone::network {

/// A fitted candidate laid out in zones and flows; numbers carry their derivatives with respect to
/// the model's (at most three) parameters.
struct ZoneLayout {
  using Number = core::Dual<double, 3>;
  struct Zone {
    std::string name;
    Number volume;       ///< [m3]
    bool still = false;  ///< stagnant: little gas leaves it
  };
  /// One line of "flows"; "feed" and "overflow" are the ends.
  struct Flow {
    std::string from;
    std::string to;
    bool exchange = false;
    std::optional<Number> flow;   ///< [m3/d]
    std::optional<Number> share;  ///< [1]
  };
  std::vector<Zone> zones;
  std::vector<Flow> flows;
  std::vector<std::string> notes;  ///< what the layout rounds or leaves out
};

/// @param volume [m3], flow [m3/d] nominal, of the test
/// Failure: fewer than one tank in series, or more than 30 zones needed.
[[nodiscard]] core::Result<ZoneLayout> zone_layout(const ModelFit& fit, double volume, double flow);

}  // namespace stillzone::network
