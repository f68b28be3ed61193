#pragma once

#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <variant>

#include "kinetics/expression_graph.hpp"

namespace stillzone::kinetics {

/// Where and why a text is no expression. `position` counts characters from 1.
struct ExpressionError {
  std::size_t position = 0;
  std::string problem;  ///< "unknown name \"S_acc\"", "a \")\" is missing", ...
  std::string way_out;  ///< "Did you mean \"S_ac\"?"
};

/// Turns a name into a node; empty when it is not known.
using NameLookup = std::function<std::optional<NodeId>(std::string_view name)>;
/// For the hint of an unknown name.
using NameSuggestion = std::function<std::string(std::string_view name)>;

/// Grammar: + - * / ^ (right-associative, binds tighter than unary minus on its left), unary - and
/// +, parentheses, numbers (1, 0.5, 1e-6), names ([A-Za-z_][A-Za-z0-9_]*), and the functions exp,
/// log (natural), log10, sqrt, min, max, and the smooth helpers
///   monod(s, k) = s / (k + s),  inhibition(i, k) = 1 / (1 + i / k),
///   hill(x, k, n) = k^n / (k^n + x^n).
/// At most 4096 characters, nesting at most 64.
[[nodiscard]] std::variant<NodeId, ExpressionError> parse_expression(
    std::string_view text, ExpressionGraph& graph, const NameLookup& lookup,
    const NameSuggestion& suggestion);

}  // namespace stillzone::kinetics
