#pragma once

#include <optional>
#include <vector>

#include "network/tracer/exponential_tail.hpp"
#include "network/tracer/net_curve.hpp"

namespace stillzone::network {

/// Nodes of a pulse curve from the dose on, to be joined by straight lines or summed by a rule.
struct PulseNodes {
  std::vector<double> age;     ///< [d] rising, from 0
  std::vector<double> height;  ///< [g/m3]
};

/// The exponential after the peak, unless the last number lies clearly below it: then the curve has
/// ended, and a tail would be made up.
[[nodiscard]] std::optional<ExponentialTail> believable_tail(const NetCurve& curve);

/// The samples, those under the limit after the last number on the tail (at their limit at most).
/// From the dose to the first sample: a curve that rises there started at 0, as behind any delay or
/// second tank; one that falls was level, for how high a short circuit rose nobody saw.
[[nodiscard]] PulseNodes pulse_nodes(const NetCurve& curve,
                                     const std::optional<ExponentialTail>& tail);

/// Adds nodes along the exponential from a height [g/m3] until next to nothing is left under it.
void append_tail(const ExponentialTail& tail, double start_height, PulseNodes& nodes);

}  // namespace stillzone::network
