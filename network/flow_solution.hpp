#pragma once

#include <span>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/flow_equations.hpp"
#include "network/flow_system.hpp"

namespace stillzone::network {

/// The flow equations of a case, factored, and what they give for any state of its schedules.
struct FlowSolution {
  explicit FlowSolution(const Case& the_case);

  FlowEquations equations;
  FlowSystem system;
  std::vector<double> means;  ///< of the schedules

  /// The known variables of the system for given schedule factors and feed rates; the others 0.
  [[nodiscard]] std::vector<double> known_variables(const Case& the_case,
                                                    const SwitchState& state) const;
  /// All variables of the system for given schedule factors and feed rates.
  [[nodiscard]] std::vector<double> variables(const Case& the_case, const SwitchState& state) const;
  /// Schedules at their means, records at time t.
  [[nodiscard]] SwitchState mean_state(const Case& the_case, double t) const;
};

/// Stream rates [m3/d] from the variables: an exchange carries its flow both ways and its drift on
/// top.
[[nodiscard]] std::vector<double> stream_rates(std::span<const Stream> streams,
                                               const Case& the_case, const FlowEquations& equations,
                                               std::span<const double> variables);

}  // namespace stillzone::network
