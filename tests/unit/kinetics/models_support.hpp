#pragma once

#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "kinetics/kinetic_model.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics::test {

/// A model from its text; faults (joined) go to `faults` and nothing is returned then.
std::optional<KineticModel> model_from(std::string_view text, std::string& faults,
                                       const std::string& name = "model.json");
/// A shipped model; throws when it does not load.
KineticModel shipped(const std::string& name);
/// A shipped model through a case's "kinetics" key.
std::optional<KineticModel> loaded(const std::string& kinetics_json, std::string& faults,
                                   std::vector<core::FreeQuantity>* free_quantities = nullptr);

/// Inputs of a program at a liquid state: components by name (others 0), implicits, gases.
struct ProgramState {
  std::vector<std::pair<std::string, double>> values;
  double temperature = 308.15;
  double gas_transfer = 0.0;
  double gas_temperature = 308.15;
};
std::vector<double> inputs_of(const KineticModel& model, const ProgramState& state);
double value_of(const KineticModel& model, NodeId node, std::span<const double> inputs);
/// A term, parameter or derived quantity by name.
double named_value(const KineticModel& model, const std::string& name,
                   std::span<const double> inputs);

}  // namespace stillzone::kinetics::test
