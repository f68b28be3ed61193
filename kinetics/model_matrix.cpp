#include "kinetics/model_matrix.hpp"

#include "core/require.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics {

ModelMatrix model_matrix(const KineticModel& model, double temperature) {
  SZ_REQUIRE(model.program != nullptr, "model \"{}\" was not read", model.name);
  const ModelProgram& program = *model.program;
  std::vector<double> inputs(program.n_inputs(), 0.0);
  inputs[program.input_temperature()] = temperature;
  inputs[program.input_gas_temperature()] = temperature;
  ModelMatrix matrix;
  matrix.temperature = temperature;
  for (const Process& process : program.processes) {
    MatrixRow row{process.name, process.meaning, process.rate_text, {}};
    for (std::size_t i = 0; i < process.stoichiometry.size(); ++i) {
      const auto& [component, coefficient] = process.stoichiometry[i];
      row.entries.push_back(
          {component, process.stoichiometry_text[i], program.graph.evaluate(coefficient, inputs)});
    }
    matrix.rows.push_back(std::move(row));
  }
  for (const ModelTerm& term : program.terms) matrix.terms.push_back({term.name, term.text});
  for (std::size_t i = 0; i < model.implicits.size(); ++i) {
    matrix.equations.push_back({model.implicits[i].name, program.implicit_text[i]});
  }
  for (std::size_t g = 0; g < model.gases.size(); ++g) {
    matrix.transfers.push_back({model.gases[g].name, program.transfer_text[g]});
  }
  for (const ModelParameter& parameter : program.parameters) {
    matrix.parameters.push_back({parameter.name, parameter.unit, parameter.meaning,
                                 parameter.source, parameter.law, parameter.value,
                                 program.graph.evaluate(parameter.node, inputs)});
  }
  return matrix;
}

}  // namespace stillzone::kinetics
