#pragma once

#include <functional>

#include "core/result.hpp"
#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/run_result.hpp"

namespace stillzone::network {

struct RunHooks {
  /// Share of the run done, 0 to 1 (steady: unknown beforehand, then the model time [d] reached is
  /// in `time_d`); may be empty.
  std::function<void(double share, double time_d)> progress;
};

/// Runs the case as its "run" block says.
/// Failure (exit 3): no steady state, a failed integration; with zone, component, time, what to
/// try.
[[nodiscard]] core::Result<RunResult> run_case(const Case& the_case, const FlowBalance& balance,
                                               const RunHooks& hooks);

}  // namespace stillzone::network
