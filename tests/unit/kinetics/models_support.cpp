#include "tests/unit/kinetics/models_support.hpp"

#include <stdexcept>

#include "core/units.hpp"

namespace stillzone::kinetics::test {

std::optional<KineticModel> model_from(std::string_view text, std::string& faults,
                                       const std::string& name) {
  core::FaultList list;
  const core::UnitReader units;
  std::optional<KineticModel> model;
  if (const auto document = core::JsonDocument::parse(text, name, ".", list)) {
    model = read_model(*document, units, list);
  }
  faults = list.text();
  return model;
}

KineticModel shipped(const std::string& name) {
  std::string faults;
  auto model = model_from(shipped_model_text(name), faults, name);
  if (!model) throw std::runtime_error("model " + name + ": " + faults);
  return std::move(*model);
}

std::optional<KineticModel> loaded(const std::string& kinetics_json, std::string& faults,
                                   std::vector<core::FreeQuantity>* free_quantities) {
  core::FaultList list;
  const core::UnitReader units;
  std::vector<core::FreeQuantity> free;
  std::optional<KineticModel> model;
  const auto document = core::JsonDocument::parse("{\n  \"kinetics\": " + kinetics_json + "\n}",
                                                  "case.json", ".", list);
  if (document) {
    const core::ReadingContext context{*document, units, list, free};
    model = load_model(context, document->root()["kinetics"], "/kinetics");
  }
  faults = list.text();
  if (free_quantities != nullptr) *free_quantities = free;
  return model;
}

std::vector<double> inputs_of(const KineticModel& model, const ProgramState& state) {
  const ModelProgram& program = *model.program;
  std::vector<double> inputs(program.n_inputs(), 0.0);
  for (const auto& [name, value] : state.values) {
    if (const auto component = model.component(name)) {
      inputs[*component] = value;
      continue;
    }
    if (const auto gas = model.gas(name)) {
      inputs[program.n_components + program.n_implicits + *gas] = value;
      continue;
    }
    bool found = false;
    for (std::size_t i = 0; i < model.implicits.size(); ++i) {
      if (model.implicits[i].name != name) continue;
      inputs[program.n_components + i] = value;
      found = true;
    }
    if (!found) throw std::runtime_error("no quantity " + name);
  }
  inputs[program.input_temperature()] = state.temperature;
  inputs[program.input_gas_transfer()] = state.gas_transfer;
  inputs[program.input_gas_temperature()] = state.gas_temperature;
  return inputs;
}

double value_of(const KineticModel& model, NodeId node, std::span<const double> inputs) {
  return model.program->graph.evaluate(node, inputs);
}

double named_value(const KineticModel& model, const std::string& name,
                   std::span<const double> inputs) {
  for (const ModelTerm& term : model.program->terms) {
    if (term.name == name) return value_of(model, term.node, inputs);
  }
  for (const ModelParameter& parameter : model.program->parameters) {
    if (parameter.name == name) return value_of(model, parameter.node, inputs);
  }
  for (std::size_t i = 0; i < model.derived.size(); ++i) {
    if (model.derived[i].name == name) return value_of(model, model.program->derived[i], inputs);
  }
  throw std::runtime_error("no quantity " + name);
}

}  // namespace stillzone::kinetics::test
