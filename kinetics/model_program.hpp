#pragma once

#include <cstddef>
#include <string>
#include <utility>
#include <vector>

#include "kinetics/expression_graph.hpp"

namespace stillzone::kinetics {

/// A process as the model's file gives it, and as expressions.
struct Process {
  std::string name;
  std::string meaning;
  std::string rate_text;
  NodeId rate;  ///< [per m3 and d, in the unit of its leading component]
  /// Component number and coefficient (closing coefficients already worked out).
  std::vector<std::pair<std::size_t, NodeId>> stoichiometry;
};

/// What a model's text became: one expression graph and its roots. Inputs are numbered: components,
/// implicit unknowns, gases, then T [K], kLa [1/d], T_gas [K] (`input_temperature()` ...).
struct ModelProgram {
  ExpressionGraph graph;
  std::size_t n_components = 0;
  std::size_t n_implicits = 0;
  std::size_t n_gases = 0;
  std::vector<Process> processes;
  std::vector<NodeId> source;     ///< n_components: net production, gas transfer taken off
  std::vector<NodeId> implicit;   ///< n_implicits: residuals, 0 when solved
  std::vector<NodeId> transfer;   ///< n_gases: from liquid into gas [gas unit per m3 liquid and d]
  std::vector<NodeId> derived;
  NodeId vapour_pressure;         ///< [bar], of T_gas alone

  [[nodiscard]] std::size_t input_temperature() const {
    return n_components + n_implicits + n_gases;
  }
  [[nodiscard]] std::size_t input_gas_transfer() const { return input_temperature() + 1; }
  [[nodiscard]] std::size_t input_gas_temperature() const { return input_temperature() + 2; }
  [[nodiscard]] std::size_t n_inputs() const { return input_temperature() + 3; }
};

}  // namespace stillzone::kinetics
