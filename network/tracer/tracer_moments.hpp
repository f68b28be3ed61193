#pragma once

#include <string>
#include <vector>

#include "core/result.hpp"
#include "network/tracer/residence_curve.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// The tail beyond the last sample: an exponential fitted to the last falling samples.
struct TracerTail {
  double share = 0.0;       ///< [1] of the whole area
  double rate = 0.0;        ///< [1/d] of decay; 0 when no tail was added
  double rate_error = 0.0;  ///< [1/d] standard error of the rate
  std::string note;         ///< how it was fitted, or why there is none
};

/// Standard deviations from the errors of the samples alone, by drawing the samples again; those of
/// dose, flow, volume and background come on top. Zero draws: nothing could be said.
struct MomentErrors {
  double recovery = 0.0;  ///< [1]
  double mean = 0.0;      ///< [d]
  double variance = 0.0;  ///< [d2]
  double t10 = 0.0;       ///< [d]
  double t50 = 0.0;       ///< [d]
  double t90 = 0.0;       ///< [d]
  int n_draws = 0;        ///< of 200, that gave a curve
};

/// What the samples say without any model. Ages [d] are turnovers since the dose times V/Q; of a
/// dose that took time, half its length is taken off mean and t10, t50, t90 (exact for the mean, to
/// first order for the others), its length squared / 12 off the variance. `curve` still has it.
///
/// Assumed where nothing was measured: before the first sample a curve that rises from there
/// started at 0 at the dose, one that falls was level; a sample under the limit lies half way
/// between background and limit, at 0 before the first number, and on the fitted tail (the limit at
/// most) after the last.
struct TracerMoments {
  double hydraulic_retention_time = 0.0;  ///< [d] V/Q
  double recovery = 0.0;                  ///< [1] at the outlet / dosed, tail included
  double area = 0.0;             ///< [g d/m3] under the net curve, tail included; of a step
                                 ///< test [1], its level taken as 1
  double mean = 0.0;             ///< [d]
  double variance = 0.0;         ///< [d2] >= 0
  double active_fraction = 0.0;  ///< [1] mean / hydraulic_retention_time
  double t10 = 0.0;              ///< [d]
  double t50 = 0.0;              ///< [d]
  double t90 = 0.0;              ///< [d]
  double morrill = 0.0;   ///< [1] t90/t10, Morrill (1932), J. AWWA 24:1442; 0: t10 is not known
  double baffling = 0.0;  ///< [1] t10/hydraulic_retention_time
  double before_first_sample = 0.0;  ///< [1] share of the area assumed before the first sample
  TracerTail tail;
  ResidenceCurve curve;  ///< ages [d], tail included
  MomentErrors errors;
  std::vector<std::string> verdict;  ///< on the data, in plain sentences, gravest first
};

/// Moments of the outlet's samples. Failure: fewer than 4 usable samples, no tracer seen, a curve
/// that is mostly noise, or unequal steps where the rule wants equal ones. A step test is always
/// integrated by straight lines in F.
[[nodiscard]] core::Result<TracerMoments> tracer_moments(const TracerTest& test,
                                                         const SamplingPoint& point,
                                                         IntegrationRule rule);

}  // namespace stillzone::network
