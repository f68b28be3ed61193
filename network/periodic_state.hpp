#pragma once

#include <functional>
#include <optional>
#include <span>
#include <string>

#include "core/dae/integrator.hpp"
#include "core/result.hpp"
#include "network/digester_system.hpp"

namespace stillzone::network {

/// The time after which everything that switches has come round [d]: the least common multiple of
/// the periods of the schedules in use.
/// Failure: nothing switches; something switches once (a window, a record); the periods have no
/// common multiple within 1000 of the longest.
[[nodiscard]] core::Result<double> common_period(const Case& the_case);

struct PeriodicReport {
  double period = 0.0;    ///< [d]
  int cycles = 0;         ///< integrated until periodic
  double residual = 0.0;  ///< largest relative change of an unknown over the last cycle
  double time = 0.0;      ///< [d] start of the first cycle not yet integrated
};

/// Integrates cycle after cycle until the states at the start of two cycles in a row agree to
/// `agreement` relative (an unknown below its floor: to that share of the floor).
/// y in and out, consistent; q in and out.
/// Failure: not periodic after `most_cycles`, or a failed integration.
[[nodiscard]] core::Result<PeriodicReport> find_periodic_state(
    DigesterSystem& system, core::Integrator& integrator, double period, double agreement,
    int most_cycles, const std::function<void(double time)>& progress, std::span<double> y);

}  // namespace stillzone::network
