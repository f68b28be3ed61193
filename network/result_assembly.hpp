#pragma once

#include <span>
#include <vector>

#include "network/case.hpp"
#include "network/digester_system.hpp"
#include "network/run_result.hpp"
#include "network/snapshot.hpp"

namespace stillzone::network {

/// Fills the states of zones, outlets and headspaces, and the flow table.
/// @param y the state to show
/// @param point rates and feed states to show it with: of the steady conditions, or the time means
///   of a run
void assemble_places(const Case& the_case, DigesterSystem& system, SnapshotMaker& snapshots,
                     std::span<const double> y, const OperatingPoint& point, RunResult& result);

/// Adds the warnings that a state and its books give: balances worse than `tolerance` explains,
/// concentrations below 0, shut gas pipes.
/// @param steady a shut pipe in a steady state is worth a word, at one instant of a run it is not
void assemble_warnings(const Case& the_case, const DigesterSystem& system,
                       std::span<const double> y, double tolerance, bool steady, RunResult& result);

/// Which microbial groups live of the digester itself in a steady state, and which it only passes
/// on: a group lives where more of it leaves than comes in with the feed.
/// @return "" when the model names no groups
[[nodiscard]] std::string living_groups(const Case& the_case, const DigesterSystem& system,
                                        std::span<const double> y, const OperatingPoint& point);

}  // namespace stillzone::network
