#pragma once

#include <array>
#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "core/json_reader.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics {

/// How a parameter follows the temperature.
struct TemperatureLaw {
  enum class Kind {
    none,
    enthalpy,     ///< value * exp(amount / (100 R) * (1/at - 1/T)), van 't Hoff
    pk_enthalpy,  ///< value - amount / (100 R ln 10) * (1/at - 1/T): the same for a pK
    theta,        ///< value * amount ^ (T - at), Arrhenius as the trade writes it
    expression,   ///< any formula of `value`, T and other parameters
  };
  Kind kind = Kind::none;
  double amount = 0.0;  ///< [J/mol], or theta [1]
  double at = 298.15;   ///< [K] where the value holds
  std::string expression = {};
  std::string pointer = {};
};

/// Whose temperature "T" means: the liquid's, or (in the water vapour law) the headspace's.
enum class TemperatureOf { liquid, gas };

/// All names of one model file and what they stand for, and the only place where its expressions
/// are parsed. Terms and parameters may be written in any order; a circle is a fault.
class ModelNames {
 public:
  enum class Kind { component, implicit, gas, gas_pressure, parameter, term };

  /// Reserves R, T, kLa, T_gas and the names of functions.
  ModelNames(const core::ReadingContext& context, ModelProgram& program, double gas_constant);

  /// Adds a name; a fault when it is no identifier or already stands for something.
  void declare(const std::string& name, Kind kind, std::size_t index, const std::string& pointer);
  void set_gas_amount(std::size_t gas, double kmol_per_unit);
  void set_parameter(std::size_t index, double value, TemperatureLaw law);
  /// Another value for a parameter already set; its law stays. Before anything is parsed.
  void change_parameter(std::size_t index, double value) { parameters_[index].value = value; }
  void set_term(std::size_t index, std::string text, std::string pointer);

  [[nodiscard]] bool knows(std::string_view name) const;
  [[nodiscard]] std::optional<std::size_t> find(std::string_view name, Kind kind) const;
  [[nodiscard]] std::vector<std::string> names(Kind kind) const;
  /// "component", "parameter", ... for messages.
  [[nodiscard]] static std::string kind_name(Kind kind);

  /// The node of a name. Adds faults of a term's own text once; a term at fault stands for 1.
  [[nodiscard]] std::optional<NodeId> node(std::string_view name, TemperatureOf of);
  /// Parses the text found at a pointer; faults carry pointer, line and character.
  [[nodiscard]] std::optional<NodeId> parse(std::string_view text, const std::string& pointer,
                                            TemperatureOf of = TemperatureOf::liquid);
  /// A bare number or an expression; anything else is a fault.
  [[nodiscard]] std::optional<NodeId> number_or_expression(
      const core::Json& node, const std::string& pointer, TemperatureOf of = TemperatureOf::liquid);
  /// Name of an input, for messages: "S_ac", "T".
  [[nodiscard]] std::string input_name(std::size_t input) const;

 private:
  struct Symbol {
    Kind kind = Kind::component;
    std::size_t index = 0;
    std::string pointer;
  };
  struct Resolved {
    std::optional<NodeId> node;
    bool in_progress = false;
  };
  struct ParameterText {
    double value = 0.0;
    TemperatureLaw law;
    std::array<Resolved, 2> resolved;
  };
  struct TermText {
    std::string text;
    std::string pointer;
    std::array<Resolved, 2> resolved;
  };

  NodeId temperature(TemperatureOf of);
  NodeId parameter(const std::string& name, std::size_t index, TemperatureOf of);
  NodeId with_law(const ParameterText& parameter, TemperatureOf of);
  NodeId term(const std::string& name, std::size_t index, TemperatureOf of);
  NodeId parse_named(const std::string& name, std::string_view text, const std::string& pointer,
                     Resolved& resolved, TemperatureOf of, std::optional<NodeId> value);
  [[nodiscard]] std::optional<NodeId> parse_with(std::string_view text, const std::string& pointer,
                                                 TemperatureOf of, std::optional<NodeId> value);
  void fault(const std::string& pointer, std::string found, std::string allowed,
             std::string way_out, std::size_t character = 0);
  void circle_fault(const std::string& name, const std::string& pointer);

  const core::ReadingContext& context_;
  ModelProgram& program_;
  double gas_constant_;
  std::unordered_map<std::string, Symbol> symbols_;
  std::vector<std::string> order_;  ///< names as declared, for hints
  std::vector<double> gas_amounts_;
  std::vector<ParameterText> parameters_;
  std::vector<TermText> terms_;
  std::vector<std::string> open_;  ///< names being worked out, outermost first
};

}  // namespace stillzone::kinetics
