#pragma once

#include <span>

#include "network/tracer/rtd_model.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// A dose as the models see it: time in nominal turnovers, theta = integral of Q/V since the dose.
struct DoseInTurnovers {
  enum class Kind { pulse, step };
  Kind kind = Kind::pulse;
  /// [g/m3] pulse: mass / nominal volume; step: what is added to the feed.
  double strength = 0.0;
  double length = 0.0;  ///< [turnovers] of a pulse; 0: at once
};

/// The test's dose. The mass of a timed dose is spread evenly over the turnovers that pass while it
/// lasts (an even mass rate where the flow is even meanwhile).
[[nodiscard]] DoseInTurnovers dose_in_turnovers(const TracerTest& test);

/// Net concentration at the outlet theta turnovers after the dose began [g/m3]; 0 for theta < 0.
///   pulse at once:   (M/V) E(theta)
///   pulse of length: (M/V)/length (F(theta) - F(theta - length))
///   step:            C F(theta)
/// What passes at one instant (a bypass) shows while the dose lasts and at no other time: F carries
/// it exactly.
/// @param gradient [g/m3 per unit of each parameter], size p or empty
[[nodiscard]] double response_to_dose(const RtdModel& model, std::span<const double> p,
                                      const DoseInTurnovers& dose, double theta,
                                      std::span<double> gradient);

}  // namespace stillzone::network
