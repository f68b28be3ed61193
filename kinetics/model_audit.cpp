#include "kinetics/model_audit.hpp"

#include <algorithm>
#include <cmath>

#include "core/require.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics {

namespace {

constexpr std::array<Balance, 4> kBalances{Balance::cod, Balance::carbon, Balance::nitrogen,
                                           Balance::charge};

void add(ProcessAudit& audit, const Content& content, double amount) {
  for (std::size_t b = 0; b < kBalances.size(); ++b) {
    const double part = amount * content_of(content, kBalances[b]);
    audit.closures[b].error += part;
    audit.closures[b].turnover += std::abs(part);
  }
}

}  // namespace

double Closure::relative() const { return turnover > 0.0 ? std::abs(error) / turnover : 0.0; }

double ModelAudit::worst(Balance balance) const {
  double worst = 0.0;
  for (const ProcessAudit& process : processes) {
    worst = std::max(worst, process.closures[static_cast<std::size_t>(balance)].relative());
  }
  return worst;
}

ModelAudit audit_model(const KineticModel& model, double temperature) {
  SZ_REQUIRE(model.program != nullptr, "model \"{}\" was not read", model.name);
  const ModelProgram& program = *model.program;
  std::vector<double> inputs(program.n_inputs(), 0.0);
  inputs[program.input_temperature()] = temperature;
  inputs[program.input_gas_temperature()] = temperature;
  ModelAudit audit;
  audit.temperature = temperature;
  for (const Process& process : program.processes) {
    ProcessAudit row{process.name, {}};
    for (const auto& [component, coefficient] : process.stoichiometry) {
      add(row, model.components[component].content, program.graph.evaluate(coefficient, inputs));
    }
    audit.processes.push_back(std::move(row));
  }
  for (std::size_t g = 0; g < model.gases.size(); ++g) {
    ProcessAudit row{"transfer of " + model.gases[g].name, {}};
    add(row, model.components[program.transfer_from[g]].content, -1.0);
    add(row, model.gases[g].content, 1.0);
    audit.processes.push_back(std::move(row));
  }
  return audit;
}

}  // namespace stillzone::kinetics
