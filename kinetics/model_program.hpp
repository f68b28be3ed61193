#pragma once

#include <cstddef>
#include <string>
#include <utility>
#include <vector>

#include "kinetics/expression_graph.hpp"

namespace stillzone::kinetics {

/// A parameter as the model runs with it.
struct ModelParameter {
  std::string name;
  std::string unit;
  std::string meaning;
  std::string source;
  std::string law;     ///< temperature law in words; empty when there is none
  double value = 0.0;  ///< at the law's reference temperature, in `unit`
  NodeId node;         ///< the value at the liquid's temperature
};

/// A named intermediate quantity.
struct ModelTerm {
  std::string name;
  std::string text;
  NodeId node;
};

/// A process as the model's file gives it, and as expressions.
struct Process {
  std::string name;
  std::string meaning;
  std::string rate_text;
  NodeId rate;  ///< [per m3 and d, in the unit of its leading component]
  /// Component number and coefficient (closing coefficients already worked out).
  std::vector<std::pair<std::size_t, NodeId>> stoichiometry;
  std::vector<std::string> stoichiometry_text;  ///< as written, one per entry of `stoichiometry`
};

/// What a model's text became: one expression graph and its roots. Inputs are numbered: components,
/// implicit unknowns, gases, then T [K], kLa [1/d], T_gas [K] (`input_temperature()` ...).
struct ModelProgram {
  ExpressionGraph graph;
  std::size_t n_components = 0;
  std::size_t n_implicits = 0;
  std::size_t n_gases = 0;
  std::vector<ModelParameter> parameters;
  std::vector<ModelTerm> terms;
  std::vector<Process> processes;
  std::vector<NodeId> source;    ///< n_components: net production, gas transfer taken off
  std::vector<NodeId> implicit;  ///< n_implicits: residuals, 0 when solved
  std::vector<NodeId> transfer;  ///< n_gases: from liquid into gas [gas unit per m3 liquid and d]
  std::vector<std::size_t> transfer_from;  ///< n_gases: the component each gas comes from
  std::vector<std::string> transfer_text;  ///< n_gases: the transfer as written
  std::vector<std::string> implicit_text;  ///< n_implicits: the equation as written
  std::vector<NodeId> derived;
  NodeId vapour_pressure;  ///< [bar], of T_gas alone

  [[nodiscard]] std::size_t input_temperature() const {
    return n_components + n_implicits + n_gases;
  }
  [[nodiscard]] std::size_t input_gas_transfer() const { return input_temperature() + 1; }
  [[nodiscard]] std::size_t input_gas_temperature() const { return input_temperature() + 2; }
  [[nodiscard]] std::size_t n_inputs() const { return input_temperature() + 3; }
};

}  // namespace stillzone::kinetics
