#pragma once

#include "network/case.hpp"

namespace stillzone::network {

/// Overpressure [bar] over which a gas pipe's law bends from closed to linear. Small against the
/// overpressure of any digester (0.01 bar and more); a test shows that results do not depend on it.
inline constexpr double kPipeOpeningWidth = 1e-5;

/// Flow of a gas pipe at headspace conditions, and how it grows with the pressure.
struct PipeFlow {
  double flow = 0.0;         ///< [m3/d] >= 0
  double by_pressure = 0.0;  ///< [m3/d/bar] d flow / d pressure, >= 0
};

/// flow = coefficient * ramp(P - back - opening), one way only:
///   ramp(x) = 0 for x <= 0,  w s^3 (6 - 8 s + 3 s^2) with s = x / w for 0 < x < w,  x for x >= w.
/// The middle piece joins both with equal value, slope and curvature, so that the flow is twice
/// continuously differentiable; it is exactly 0 below the opening pressure.
/// Source of the linear law: Rosen and Jeppsson (2006), Aspects on ADM1 implementation within the
/// BSM2 framework (gas flow by overpressure); the one-way opening is common practice, no source.
/// @param pressure [bar] total in the headspace, finite
/// @param width w [bar] > 0
[[nodiscard]] PipeFlow pipe_flow(const GasPipe& pipe, double pressure,
                                 double width = kPipeOpeningWidth);

}  // namespace stillzone::network
