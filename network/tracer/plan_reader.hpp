#pragma once

#include <optional>

#include "core/json_reader.hpp"
#include "network/tracer/test_plan.hpp"

namespace stillzone::network {

/// Reads a test document for planning: volume, flow (constant), dose ("mass" may be left to the
/// plan), background, recovery, and the block
///   "plan": {"error": "3 %", "detection_limit": "0.02 g/m3", "peak": "5 g/m3", "samples": 25,
///            "duration": "60 d", "earliest": "1 h", "shortest_gap": "2 h",
///            "suspect": {"dead_fraction": "20 %", "bypass_fraction": "5 %",
///                        "stagnant_fraction": "25 %", "exchange_flow": "45 m3/d"}}
/// of which "error" and "detection_limit" are required. Samples taken already play no part.
[[nodiscard]] std::optional<PlanRequest> read_plan_request(const core::JsonDocument& document,
                                                           const core::UnitReader& units,
                                                           core::FaultList& faults);

}  // namespace stillzone::network
