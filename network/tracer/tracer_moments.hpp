#pragma once

#include <string>
#include <vector>

#include "core/result.hpp"
#include "network/tracer/residence_curve.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// The tail beyond the last sample: an exponential fitted to the last falling samples.
struct TracerTail {
  double share = 0.0;  ///< [1] of the whole area
  double rate = 0.0;   ///< [1/d] of decay; 0 when no tail was added
  std::string note;    ///< how it was fitted, or why there is none
};

/// What the samples say without any model. Ages [d] are turnovers since the dose times V/Q; a dose
/// that took time is taken off mean and variance (half its length; its length squared / 12).
struct TracerMoments {
  double hydraulic_retention_time = 0.0;  ///< [d] V/Q
  double recovery = 0.0;                  ///< [1] at the outlet / dosed, tail included
  double area = 0.0;                      ///< [g d/m3] under the net curve, tail included
  double mean = 0.0;                      ///< [d]
  double variance = 0.0;                  ///< [d2]
  double active_fraction = 0.0;           ///< [1] mean / hydraulic_retention_time
  double t10 = 0.0;                       ///< [d]
  double t50 = 0.0;                       ///< [d]
  double t90 = 0.0;                       ///< [d]
  double morrill = 0.0;                   ///< [1] t90/t10; Morrill (1932), J. AWWA 24:1442
  double baffling = 0.0;                  ///< [1] t10/hydraulic_retention_time
  TracerTail tail;
  ResidenceCurve curve;              ///< ages [d], tail included
  std::vector<std::string> verdict;  ///< on the data, in plain sentences, gravest first
};

/// Moments of the outlet's samples. Failure: fewer than 4 usable samples, or no tracer seen.
[[nodiscard]] core::Result<TracerMoments> tracer_moments(const TracerTest& test,
                                                         const SamplingPoint& point,
                                                         IntegrationRule rule);

}  // namespace stillzone::network
