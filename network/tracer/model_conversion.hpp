#pragma once

#include <span>

#include "network/tracer/rtd_model.hpp"

namespace stillzone::network {

// What is left of a second-order decay dc/dt = -k c^2 between feed and outlet, relative to the
// feed, for the residence times of a model: the two ends of what mixing inside the tank can do.
// Time in nominal turnovers, K = k c0 V/Q. What passes at once (a bypass) leaves as it came.

/// Total segregation: integral of E/(1 + K theta). Source: Danckwerts (1958), Chem. Eng. Sci. 8:93.
[[nodiscard]] double second_order_segregated(const RtdModel& model, std::span<const double> p,
                                             double k, double tolerance);
/// Maximum mixedness: dc/dl = K c^2 - E/(1-F) (1 - c) from the oldest age down to 0.
/// Source: Zwietering (1959), Chem. Eng. Sci. 11:1-15.
[[nodiscard]] double second_order_maximum_mixedness(const RtdModel& model,
                                                    std::span<const double> p, double k,
                                                    double tolerance);

}  // namespace stillzone::network
