#pragma once

#include <vector>

#include "core/result.hpp"
#include "network/digester_system.hpp"

namespace stillzone::network {

/// The model's healthy inoculum in every zone, its seed gas in every headspace; implicit unknowns
/// not yet solved.
[[nodiscard]] std::vector<double> seeded_state(const Case& the_case, const StateLayout& layout);

/// What the run block gives by name; what it does not name is 0, but a headspace not named at all
/// holds the model's seed gas.
[[nodiscard]] std::vector<double> given_state(const Case& the_case, const StateLayout& layout);

/// Seeded or given, as the run block says, with the implicit unknowns solved. (Start "steady" is
/// sought from the seeded state.) Failure: a state at which they cannot be solved.
[[nodiscard]] core::Result<std::vector<double>> start_state(const Case& the_case,
                                                            DigesterSystem& system);

}  // namespace stillzone::network
