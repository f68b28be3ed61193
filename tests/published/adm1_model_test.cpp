// The shipped model `adm1` against outside numbers:
//  - tests/published/data/adm1_rates.json: process rates, net sources and gas transfers of random
//    states, from an independent SciPy script of the published equations;
//  - the steady state printed in Rosen and Jeppsson (2006), Aspects on ADM1 implementation within
//    the BSM2 framework, Lund University (13 decimals), at which every derivative vanishes;
//  - temperature terms (check values CH-1 to CH-7; constants of the same report).
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <map>
#include <nlohmann/json.hpp>

#include "core/units.hpp"
#include "kinetics/kinetic_model.hpp"
#include "kinetics/model_audit.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics {
namespace {

KineticModel adm1() {
  core::FaultList faults;
  const core::UnitReader units;
  const auto document = core::JsonDocument::parse(shipped_model_text("adm1"), "adm1", ".", faults);
  auto model = document ? read_model(*document, units, faults) : std::nullopt;
  if (!model) throw std::runtime_error(faults.text());
  return std::move(*model);
}

const nlohmann::json& references() {
  static const nlohmann::json all = [] {
    std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/adm1_rates.json");
    return nlohmann::json::parse(file);
  }();
  return all;
}

using Values = std::map<std::string, double>;

std::vector<double> inputs_of(const KineticModel& model, const Values& state, double pH,
                              const Values& gas, double temperature, double gas_transfer) {
  const ModelProgram& program = *model.program;
  std::vector<double> inputs(program.n_inputs(), 0.0);
  for (const auto& [name, value] : state) inputs.at(*model.component(name)) = value;
  inputs.at(program.n_components) = pH;
  for (const auto& [name, value] : gas)
    inputs.at(program.n_components + 1 + *model.gas(name)) = value;
  inputs.at(program.input_temperature()) = temperature;
  inputs.at(program.input_gas_temperature()) = temperature;
  inputs.at(program.input_gas_transfer()) = gas_transfer;
  return inputs;
}

std::vector<double> inputs_of(const KineticModel& model, const nlohmann::json& reference) {
  return inputs_of(model, reference["state"].get<Values>(), reference["pH"].get<double>(),
                   reference["gas"].get<Values>(), reference["T_K"].get<double>(),
                   reference["kla"].get<double>());
}

/// pH is stored to 16 digits, so [H+] carries a relative error of about 2e-15 x pH: 1e-13 leaves
/// room for that and for another order of summation.
constexpr double kTolerance = 1e-13;

TEST(Adm1, HasThePublishedSize) {
  const KineticModel model = adm1();
  EXPECT_EQ(model.components.size(), 26U);
  EXPECT_EQ(model.program->processes.size(), 19U);
  EXPECT_EQ(model.gases.size(), 3U);
  ASSERT_EQ(model.implicits.size(), 1U);
  EXPECT_EQ(model.implicits[0].name, "pH");
}

TEST(Adm1, ProcessRatesAgreeWithTheIndependentScript) {
  const KineticModel model = adm1();
  for (const auto& reference : references()["states"]) {
    const auto inputs = inputs_of(model, reference);
    for (std::size_t j = 0; j < model.program->processes.size(); ++j) {
      const Process& process = model.program->processes[j];
      const double wanted = reference["rates"][j].get<double>();
      const double found = model.program->graph.evaluate(process.rate, inputs);
      EXPECT_NEAR(found, wanted, kTolerance * std::abs(wanted)) << process.name;
    }
  }
}

TEST(Adm1, SourcesAndTransfersAgreeWithTheIndependentScript) {
  const KineticModel model = adm1();
  for (const auto& reference : references()["states"]) {
    const auto inputs = inputs_of(model, reference);
    double largest = 0.0;  // what cancels in a source is of this size at most
    for (const auto& rate : reference["rates"]) largest = std::max(largest, rate.get<double>());
    for (std::size_t g = 0; g < 3; ++g) {
      const double wanted = reference["transfer"][g].get<double>();
      largest = std::max(largest, std::abs(wanted));
      EXPECT_NEAR(model.program->graph.evaluate(model.program->transfer[g], inputs), wanted,
                  kTolerance * 10.0 * std::max(1.0, std::abs(wanted)))
          << model.gases[g].name;
    }
    for (std::size_t i = 0; i < model.components.size(); ++i) {
      EXPECT_NEAR(model.program->graph.evaluate(model.program->source[i], inputs),
                  reference["source"][i].get<double>(), kTolerance * largest)
          << model.components[i].name;
    }
  }
}

TEST(Adm1, ChargesBalanceAtTheIndependentScriptsPh) {
  const KineticModel model = adm1();
  ExpressionGraph graph = model.program->graph;
  const NodeId slope = graph.derivative(model.program->implicit[0], model.program->n_components);
  for (const auto& reference : references()["states"]) {
    const auto inputs = inputs_of(model, reference);
    const double step =
        graph.evaluate(model.program->implicit[0], inputs) / graph.evaluate(slope, inputs);
    EXPECT_NEAR(step, 0.0, 1e-13) << "in units of pH";
  }
}

// Printed to 13 decimals. S_vam .. pH follow from the states.
const Values kPublishedState{
    {"S_su", 0.0119548297170},  {"S_aa", 0.0053147401716}, {"S_fa", 0.0986214009308},
    {"S_va", 0.0116250064639},  {"S_bu", 0.0132507296663}, {"S_pro", 0.0157836662845},
    {"S_ac", 0.1976297169375},  {"S_h2", 0.0000002359451}, {"S_ch4", 0.0550887764460},
    {"S_IC", 0.1526778706263},  {"S_IN", 0.1302298158037}, {"S_I", 0.3286976637215},
    {"X_c", 0.3086976637215},   {"X_ch", 0.0279472404350}, {"X_pr", 0.1025741061067},
    {"X_li", 0.0294830497073},  {"X_su", 0.4201659824546}, {"X_aa", 1.1791717989237},
    {"X_fa", 0.2430353447194},  {"X_c4", 0.4319211056360}, {"X_pro", 0.1373059089340},
    {"X_ac", 0.7605626583132},  {"X_h2", 0.3170229533613}, {"X_I", 25.6173953274430},
    {"S_cat", 0.0400000000000}, {"S_an", 0.0200000000000}};
const Values kPublishedGas{
    {"S_gas_h2", 0.0000102410356}, {"S_gas_ch4", 1.6256072099814}, {"S_gas_co2", 0.0141505346784}};
constexpr double kPublishedPh = 7.4655377698929;

// Influent, volumes and flow of the same report.
const Values kInfluent{{"S_su", 0.01},  {"S_aa", 0.001},  {"S_fa", 0.001}, {"S_va", 0.001},
                       {"S_bu", 0.001}, {"S_pro", 0.001}, {"S_ac", 0.001}, {"S_h2", 1e-8},
                       {"S_ch4", 1e-5}, {"S_IC", 0.04},   {"S_IN", 0.01},  {"S_I", 0.02},
                       {"X_c", 2.0},    {"X_ch", 5.0},    {"X_pr", 20.0},  {"X_li", 5.0},
                       {"X_su", 0.0},   {"X_aa", 0.01},   {"X_fa", 0.01},  {"X_c4", 0.01},
                       {"X_pro", 0.01}, {"X_ac", 0.01},   {"X_h2", 0.01},  {"X_I", 25.0},
                       {"S_cat", 0.04}, {"S_an", 0.02}};
constexpr double kFlow = 170.0;        // [m3/d]
constexpr double kLiquid = 3400.0;     // [m3]
constexpr double kHeadspace = 300.0;   // [m3]
constexpr double kPipe = 5e4;          // [m3/d/bar]
constexpr double kAtmosphere = 1.013;  // [bar]

/// The published steady state with the pH at which its charges balance, and what the rounding of
/// its printed figures (half a unit of the 13th decimal) can do to a node.
class PublishedState {
 public:
  explicit PublishedState(const KineticModel& model)
      : program_(*model.program),
        graph(program_.graph),
        inputs(inputs_of(model, kPublishedState, kPublishedPh, kPublishedGas, 308.15, 200.0)) {
    const std::size_t own = program_.n_components;
    const NodeId slope = graph.derivative(program_.implicit[0], own);
    for (int i = 0; i < 5; ++i) {
      inputs.at(own) -=
          graph.evaluate(program_.implicit[0], inputs) / graph.evaluate(slope, inputs);
    }
    const double charge_error = printing_error(program_.implicit[0]);
    error_of_pH_ = charge_error / std::abs(graph.evaluate(slope, inputs));
  }
  double printing_error(NodeId node) {
    double error = 0.0;
    for (std::size_t i = 0; i < program_.input_temperature(); ++i) {
      const double error_of_input = i == program_.n_components ? error_of_pH_ : 0.5e-13;
      error += error_of_input * std::abs(graph.evaluate(graph.derivative(node, i), inputs));
    }
    return error;
  }
  [[nodiscard]] double pH() const { return inputs.at(program_.n_components); }

 private:
  const ModelProgram& program_;
  double error_of_pH_ = 0.0;

 public:
  ExpressionGraph graph;
  std::vector<double> inputs;
};

// The report prints 7.4655377698929; at its own 13-decimal concentrations the charges balance
// 8e-12 below that, so its pH is good to 11 decimals.
TEST(Adm1, ThePublishedPhBalancesTheChargesToElevenDecimals) {
  const KineticModel model = adm1();
  EXPECT_NEAR(PublishedState(model).pH(), kPublishedPh, 1e-11);
}

TEST(Adm1, ThePublishedSteadyStateIsSteady) {
  const KineticModel model = adm1();
  const ModelProgram& program = *model.program;
  PublishedState published(model);
  for (std::size_t i = 0; i < model.components.size(); ++i) {
    const std::string& name = model.components[i].name;
    const double dilution = kFlow / kLiquid;
    const double change = published.graph.evaluate(program.source[i], published.inputs) +
                          dilution * (kInfluent.at(name) - kPublishedState.at(name));
    const double tolerance =
        published.printing_error(program.source[i]) + 0.5e-13 * dilution + 1e-14;
    EXPECT_NEAR(change, 0.0, tolerance) << name;
  }
}

TEST(Adm1, ThePublishedHeadspaceIsSteadyAndGivesThePublishedGasFlow) {
  const KineticModel model = adm1();
  const ModelProgram& program = *model.program;
  PublishedState published(model);
  double pressure = model.vapour_pressure(308.15);
  for (const Gas& gas : model.gases) {
    pressure += kPublishedGas.at(gas.name) * gas.kmol_per_unit * model.gas_constant * 308.15;
  }
  const double flow = kPipe * (pressure - kAtmosphere);
  EXPECT_NEAR(flow * pressure / kAtmosphere, 2955.70, 0.005);  // printed with two decimals
  for (std::size_t g = 0; g < model.gases.size(); ++g) {
    const std::string& name = model.gases[g].name;
    const double change =
        published.graph.evaluate(program.transfer[g], published.inputs) * kLiquid / kHeadspace -
        kPublishedGas.at(name) * flow / kHeadspace;
    // The flow hangs on the pressure: kPipe x 25.6 bar m3/kmol x 1e-13 / 2.
    const double tolerance = published.printing_error(program.transfer[g]) * kLiquid / kHeadspace +
                             kPublishedGas.at(name) * kPipe * 30.0 * 0.5e-13 / kHeadspace + 1e-13;
    EXPECT_NEAR(change, 0.0, tolerance) << name;
  }
}

double parameter_at(const KineticModel& model, const std::string& name, double temperature) {
  const ModelProgram& program = *model.program;
  std::vector<double> inputs(program.n_inputs(), 0.0);
  inputs.at(program.input_temperature()) = temperature;
  inputs.at(program.input_gas_temperature()) = temperature;
  for (const ModelParameter& parameter : program.parameters) {
    if (parameter.name == name) return program.graph.evaluate(parameter.node, inputs);
  }
  for (const ModelTerm& term : program.terms) {
    if (term.name == name) return program.graph.evaluate(term.node, inputs);
  }
  throw std::runtime_error("no " + name);
}

// Check values CH-1 to CH-7, printed with 7 digits: 1e-6 relative, their stated tolerance.
TEST(Adm1, TemperatureTermsHaveTheirValuesAt25And35Degrees) {
  const KineticModel model = adm1();
  struct Row {
    std::string name;
    double at_25;
    double at_35;
  };
  const std::vector<Row> rows{{"K_w", 1e-14, 2.078771e-14},
                              {"K_a_co2", std::pow(10.0, -6.35), 4.937073e-7},
                              {"K_a_IN", std::pow(10.0, -9.25), 1.110287e-9},
                              {"K_H_co2", 0.035, 0.02714669},
                              {"K_H_ch4", 0.0014, 0.001161903},
                              {"K_H_h2", 7.8e-4, 7.384654e-4},
                              {"p_h2o", 0.0313, 0.05566775}};
  for (const Row& row : rows) {
    EXPECT_NEAR(parameter_at(model, row.name, 298.15), row.at_25, 1e-12 * row.at_25) << row.name;
    EXPECT_NEAR(parameter_at(model, row.name, 308.15), row.at_35, 1e-6 * row.at_35) << row.name;
  }
  EXPECT_NEAR(model.vapour_pressure(308.15), 0.05566775, 1e-6 * 0.05566775);
}

// Conservation: the sums over one process vanish up to rounding.
TEST(Adm1, EveryProcessClosesCodCarbonAndNitrogen) {
  const ModelAudit audit = audit_model(adm1());
  EXPECT_EQ(audit.processes.size(), 19U + 3U);
  for (const Balance balance :
       {Balance::cod, Balance::carbon, Balance::nitrogen, Balance::charge}) {
    EXPECT_LT(audit.worst(balance), ModelAudit::kClosed) << balance_name(balance);
  }
}

}  // namespace
}  // namespace stillzone::kinetics
