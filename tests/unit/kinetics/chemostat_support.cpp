#include "tests/unit/kinetics/chemostat_support.hpp"

#include <map>
#include <stdexcept>
#include <string>

#include "kinetics/expression_parser.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics {

namespace {

/// Builds expressions by the parser; named terms stay known.
class Terms {
 public:
  explicit Terms(ExpressionGraph& graph) : graph_(graph) {}
  void set(const std::string& name, NodeId node) { named_[name] = node; }
  NodeId operator()(const std::string& text) {
    const auto parsed = parse_expression(text, graph_,
                                         [this](std::string_view name) -> std::optional<NodeId> {
                                           const auto found = named_.find(std::string(name));
                                           if (found == named_.end()) return std::nullopt;
                                           return found->second;
                                         },
                                         {});
    if (const auto* error = std::get_if<ExpressionError>(&parsed)) {
      throw std::invalid_argument(text + ": " + error->problem);
    }
    return std::get<NodeId>(parsed);
  }
  void define(const std::string& name, const std::string& text) { set(name, (*this)(text)); }

 private:
  ExpressionGraph& graph_;
  std::map<std::string, NodeId> named_;
};

}  // namespace

KineticModel chemostat_model() {
  auto program = std::make_unique<ModelProgram>();
  program->n_components = 4;
  program->n_implicits = 1;
  program->n_gases = 1;
  Terms term(program->graph);
  std::size_t number = 0;
  for (const char* name : {"S", "X", "C", "cations", "pH", "gas", "T", "kLa", "T_gas"}) {
    term.set(name, program->graph.input(number++));
  }
  term.define("proton", "10 ^ (-pH)");
  term.define("K_a", "4.5e-7 * exp(7646 / 8.3145e-2 * (1 / 298.15 - 1 / T) / 1000)");
  term.define("K_w", "1e-14 * exp(55900 / 8.3145 * (1 / 298.15 - 1 / T))");
  term.define("mu", "0.4 * 1.035 ^ (T - 308.15)");
  term.define("K_H", "0.035 * exp(2400 * (1 / T - 1 / 298.15))");
  term.define("bicarbonate", "K_a * C / (K_a + proton)");
  term.define("growth", "mu * monod(S, 0.15) * hill(proton, 10 ^ (-5.5), 2.5) * X");
  term.define("decay", "0.02 * X");
  term.define("transfer", "kLa * (C - bicarbonate - K_H * gas * 0.083145 * T_gas)");
  program->source = {term("-10 * growth"), term("growth - decay"),
                     term("0.3 * growth + 0.01 * decay - transfer"), term("0")};
  program->implicit = {term("cations + proton - K_w / proton - bicarbonate")};
  program->transfer = {term("transfer")};
  program->derived = {term("bicarbonate"), term("C - bicarbonate")};
  for (const char* name : {"growth", "decay"}) {
    Process process;
    process.name = name;
    process.rate = term(name);
    program->processes.push_back(process);
  }
  KineticModel model;
  model.name = "chemostat";
  model.components.resize(4);
  const std::array<const char*, 4> names{"S", "X", "C", "cations"};
  for (std::size_t i = 0; i < 4; ++i) model.components[i].name = names[i];
  model.implicits.push_back({"pH", "", "", 7.0, 2.0, 12.0});
  model.gases.resize(1);
  model.gases[0].name = "gas";
  model.derived.resize(2);
  model.program = std::move(program);
  return model;
}

}  // namespace stillzone::kinetics
