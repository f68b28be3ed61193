#pragma once

#include <vector>

#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// The net curve of one sampling point: what the tracer added, over the age of the water, that is
/// turnovers since the dose times V/Q. Counted so, a test of varying flow has the curve of a steady
/// one as long as the flows inside the tank go with the feed; where mixers drive them instead, it
/// is the usual approximation.
struct NetCurve {
  std::vector<double> age;     ///< [d] rising, >= 0
  std::vector<double> height;  ///< [g/m3] background taken off; noise below zero is kept
  std::vector<double> error;   ///< [g/m3] > 0
  /// [g/m3] of a sample under the limit: the most that may be there, so its height lies between 0
  /// and this; negative where the sample has a number.
  std::vector<double> room;

  [[nodiscard]] std::size_t size() const { return age.size(); }
  [[nodiscard]] bool censored(std::size_t i) const { return room[i] >= 0.0; }
  /// The highest sample with a number; size() when there is none.
  [[nodiscard]] std::size_t peak() const;
};

/// Where a sample under the limit is taken to lie between 0 and its room; those before the first
/// number are taken as 0 whatever this says, for the tracer has not been seen yet.
struct CensoredAt {
  double share = 0.5;  ///< 0 to 1
};
/// Samples from the dose on. Samples of the same age (the flow stood still) are averaged.
[[nodiscard]] NetCurve net_curve(const TracerTest& test, const SamplingPoint& point,
                                 const CensoredAt& censored_at);

}  // namespace stillzone::network
