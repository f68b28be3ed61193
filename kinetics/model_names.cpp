#include "kinetics/model_names.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "core/near_name.hpp"
#include "core/require.hpp"
#include "kinetics/expression_parser.hpp"

namespace stillzone::kinetics {

namespace {

/// Longest chain of terms that need each other.
constexpr std::size_t kMaxChain = 100;

constexpr std::array<std::string_view, 14> kReserved{"R",   "T",     "kLa",        "T_gas", "value",
                                                     "exp", "log",   "log10",      "sqrt",  "min",
                                                     "max", "monod", "inhibition", "hill"};

bool is_identifier(std::string_view name) {
  const auto is_letter = [](char c) {
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_';
  };
  const auto is_digit = [](char c) { return c >= '0' && c <= '9'; };
  return !name.empty() && name.size() <= 64 && is_letter(name.front()) &&
         std::ranges::all_of(name, [&](char c) { return is_letter(c) || is_digit(c); });
}

std::string section_of(ModelNames::Kind kind) {
  switch (kind) {
    case ModelNames::Kind::component:
      return "a component";
    case ModelNames::Kind::implicit:
      return "an implicit unknown";
    case ModelNames::Kind::gas:
      return "a gas";
    case ModelNames::Kind::gas_pressure:
      return "the partial pressure of a gas";
    case ModelNames::Kind::parameter:
      return "a parameter";
    case ModelNames::Kind::term:
      return "a term";
  }
  return "";
}

std::size_t slot(TemperatureOf of) { return of == TemperatureOf::liquid ? 0 : 1; }

}  // namespace

ModelNames::ModelNames(const core::ReadingContext& context, ModelProgram& program,
                       double gas_constant)
    : context_(context), program_(program), gas_constant_(gas_constant) {}

std::string ModelNames::kind_name(Kind kind) { return section_of(kind); }

void ModelNames::fault(const std::string& pointer, std::string found, std::string allowed,
                       std::string way_out, std::size_t character) {
  context_.faults.add({.file = context_.document.name(),
                       .pointer = pointer,
                       .line = context_.document.line_of(pointer),
                       .character = static_cast<int>(character),
                       .found = std::move(found),
                       .allowed = std::move(allowed),
                       .way_out = std::move(way_out)});
}

void ModelNames::declare(const std::string& name, Kind kind, std::size_t index,
                         const std::string& pointer) {
  if (!is_identifier(name)) {
    fault(pointer, fmt::format("name \"{}\"", name),
          "names are made of letters, digits and _, start with no digit and have at most 64 "
          "characters",
          "Expressions need it, write S_ac rather than S-ac.");
    return;
  }
  if (std::ranges::find(kReserved, name) != kReserved.end()) {
    fault(pointer, fmt::format("name \"{}\"", name), "it already has a meaning in expressions",
          "Choose another name.");
    return;
  }
  const auto [place, is_new] = symbols_.try_emplace(name, Symbol{kind, index, pointer});
  if (!is_new) {
    fault(pointer, fmt::format("name \"{}\"", name),
          fmt::format("it is already {} ({}), and every name stands for one thing",
                      section_of(place->second.kind), place->second.pointer),
          "Rename one of the two.");
    return;
  }
  order_.push_back(name);
  if (kind == Kind::gas) gas_amounts_.resize(std::max(gas_amounts_.size(), index + 1), 1.0);
  if (kind == Kind::parameter) parameters_.resize(std::max(parameters_.size(), index + 1));
  if (kind == Kind::term) terms_.resize(std::max(terms_.size(), index + 1));
}

void ModelNames::set_gas_amount(std::size_t gas, double kmol_per_unit) {
  gas_amounts_.resize(std::max(gas_amounts_.size(), gas + 1), 1.0);
  gas_amounts_[gas] = kmol_per_unit;
}

void ModelNames::set_parameter(std::size_t index, double value, TemperatureLaw law) {
  parameters_.resize(std::max(parameters_.size(), index + 1));
  parameters_[index] = {value, std::move(law), {}};
}

void ModelNames::set_term(std::size_t index, std::string text, std::string pointer) {
  terms_.resize(std::max(terms_.size(), index + 1));
  terms_[index] = {std::move(text), std::move(pointer), {}};
}

bool ModelNames::knows(std::string_view name) const { return symbols_.contains(std::string(name)); }

std::optional<std::size_t> ModelNames::find(std::string_view name, Kind kind) const {
  const auto found = symbols_.find(std::string(name));
  if (found == symbols_.end() || found->second.kind != kind) return std::nullopt;
  return found->second.index;
}

std::vector<std::string> ModelNames::names(Kind kind) const {
  std::vector<std::string> result;
  for (const std::string& name : order_) {
    if (symbols_.at(name).kind == kind) result.push_back(name);
  }
  return result;
}

std::string ModelNames::input_name(std::size_t input) const {
  if (input == program_.input_temperature()) return "T";
  if (input == program_.input_gas_transfer()) return "kLa";
  if (input == program_.input_gas_temperature()) return "T_gas";
  Kind kind = Kind::gas;
  std::size_t index = input;
  if (input < program_.n_components) {
    kind = Kind::component;
  } else if (input < program_.n_components + program_.n_implicits) {
    kind = Kind::implicit;
    index -= program_.n_components;
  } else {
    index -= program_.n_components + program_.n_implicits;
  }
  for (const std::string& name : order_) {
    const Symbol& symbol = symbols_.at(name);
    if (symbol.kind == kind && symbol.index == index) return name;
  }
  return "";
}

NodeId ModelNames::temperature(TemperatureOf of) {
  return program_.graph.input(of == TemperatureOf::liquid ? program_.input_temperature()
                                                          : program_.input_gas_temperature());
}

std::optional<NodeId> ModelNames::node(std::string_view name, TemperatureOf of) {
  ExpressionGraph& graph = program_.graph;
  if (name == "R") return graph.constant(gas_constant_);
  if (name == "T") return temperature(of);
  if (name == "T_gas") return graph.input(program_.input_gas_temperature());
  if (name == "kLa") return graph.input(program_.input_gas_transfer());
  const auto found = symbols_.find(std::string(name));
  if (found == symbols_.end()) return std::nullopt;
  const Symbol& symbol = found->second;
  const std::size_t first_gas = program_.n_components + program_.n_implicits;
  switch (symbol.kind) {
    case Kind::component:
      return graph.input(symbol.index);
    case Kind::implicit:
      return graph.input(program_.n_components + symbol.index);
    case Kind::gas:
      return graph.input(first_gas + symbol.index);
    case Kind::gas_pressure: {
      // p = concentration * kmol_per_unit * R * T_gas, the ideal gas law [bar]
      const NodeId factor = graph.constant(gas_amounts_[symbol.index] * gas_constant_);
      const NodeId rt = graph.multiply(factor, graph.input(program_.input_gas_temperature()));
      return graph.multiply(graph.input(first_gas + symbol.index), rt);
    }
    case Kind::parameter:
      return parameter(found->first, symbol.index, of);
    case Kind::term:
      return term(found->first, symbol.index, of);
  }
  return std::nullopt;
}

NodeId ModelNames::with_law(const ParameterText& parameter, TemperatureOf of) {
  ExpressionGraph& graph = program_.graph;
  const NodeId value = graph.constant(parameter.value);
  const TemperatureLaw& law = parameter.law;
  const auto inverse_difference = [&] {  // 1/at - 1/T
    return graph.subtract(graph.constant(1.0 / law.at),
                          graph.divide(graph.constant(1.0), temperature(of)));
  };
  const double per_kelvin = law.amount / (100.0 * gas_constant_);  // R [J/mol/K] is 100 R here
  switch (law.kind) {
    case TemperatureLaw::Kind::none:
    case TemperatureLaw::Kind::expression:
      break;
    case TemperatureLaw::Kind::enthalpy:
      return graph.multiply(
          value, graph.exp(graph.multiply(graph.constant(per_kelvin), inverse_difference())));
    case TemperatureLaw::Kind::pk_enthalpy:
      return graph.subtract(
          value, graph.multiply(graph.constant(per_kelvin / std::log(10.0)), inverse_difference()));
    case TemperatureLaw::Kind::theta:
      return graph.multiply(value,
                            graph.power(graph.constant(law.amount),
                                        graph.subtract(temperature(of), graph.constant(law.at))));
  }
  return value;
}

NodeId ModelNames::parameter(const std::string& name, std::size_t index, TemperatureOf of) {
  // A copy: parsing the law may reach this table again.
  const ParameterText text = parameters_[index];
  if (text.law.kind != TemperatureLaw::Kind::expression) return with_law(text, of);
  return parse_named(name, text.law.expression, text.law.pointer,
                     parameters_[index].resolved[slot(of)], of,
                     program_.graph.constant(text.value));
}

NodeId ModelNames::term(const std::string& name, std::size_t index, TemperatureOf of) {
  TermText& text = terms_[index];
  return parse_named(name, text.text, text.pointer, text.resolved[slot(of)], of, std::nullopt);
}

void ModelNames::circle_fault(const std::string& name, const std::string& pointer) {
  std::string chain;
  for (auto open = std::ranges::find(open_, name); open != open_.end(); ++open) {
    chain += fmt::format("\"{}\" -> ", *open);
  }
  fault(pointer, fmt::format("{}\"{}\" need each other in a circle", chain, name),
        "terms and temperature laws may use only what does not need them",
        "Break the circle, or make one of them an implicit unknown with its own equation.");
}

/// Works out a term or a law once. A text at fault, or in a circle, stands for 1 so that one
/// mistake is one message.
NodeId ModelNames::parse_named(const std::string& name, std::string_view text,
                               const std::string& pointer, Resolved& resolved, TemperatureOf of,
                               std::optional<NodeId> value) {
  if (resolved.node) return *resolved.node;
  const NodeId stand_in = program_.graph.constant(1.0);
  if (resolved.in_progress) {
    circle_fault(name, pointer);
    return stand_in;
  }
  if (open_.size() >= kMaxChain) {
    fault(pointer,
          fmt::format("\"{}\" ends a chain of more than {} terms that need each other", name,
                      kMaxChain),
          fmt::format("at most {} in a chain are allowed", kMaxChain), "Join some of them.");
    resolved.node = stand_in;
    return stand_in;
  }
  resolved.in_progress = true;
  open_.push_back(name);
  const std::optional<NodeId> node = parse_with(text, pointer, of, value);
  open_.pop_back();
  resolved.in_progress = false;
  resolved.node = node.value_or(stand_in);
  return *resolved.node;
}

std::optional<NodeId> ModelNames::parse_with(std::string_view text, const std::string& pointer,
                                             TemperatureOf of, std::optional<NodeId> value) {
  const NameLookup lookup = [&](std::string_view name) -> std::optional<NodeId> {
    if (value && name == "value") return value;
    return node(name, of);
  };
  const NameSuggestion suggestion = [&](std::string_view name) {
    std::vector<std::string> known = order_;
    for (const std::string_view reserved : kReserved) {
      if (reserved != "value" || value) known.emplace_back(reserved);
    }
    const auto nearest = core::nearest_name(name, known);
    return nearest ? fmt::format("Did you mean \"{}\"?", *nearest)
                   : std::string("Define it under \"parameters\" or \"terms\".");
  };
  const auto parsed = parse_expression(text, program_.graph, lookup, suggestion);
  if (const auto* error = std::get_if<ExpressionError>(&parsed)) {
    fault(pointer, error->problem, "", error->way_out, error->position);
    return std::nullopt;
  }
  return std::get<NodeId>(parsed);
}

std::optional<NodeId> ModelNames::parse(std::string_view text, const std::string& pointer,
                                        TemperatureOf of) {
  return parse_with(text, pointer, of, std::nullopt);
}

std::optional<NodeId> ModelNames::number_or_expression(const core::Json& node,
                                                       const std::string& pointer,
                                                       TemperatureOf of) {
  if (node.is_number()) return program_.graph.constant(node.get<double>());
  if (node.is_string()) return parse(node.get<std::string>(), pointer, of);
  fault(pointer, core::shown(node), "a number or an expression in quotes is allowed here", "");
  return std::nullopt;
}

}  // namespace stillzone::kinetics
