#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <unordered_map>
#include <vector>

#include "core/index.hpp"

namespace stillzone::kinetics {

using NodeId = core::Index<struct NodeTag>;

/// Expressions as one graph in which equal subexpressions are one node (hash-consing), simplified
/// as they are built: constants folded (never into a non-finite value), x + 0, x * 1, x * 0, x ^ 1,
/// x ^ 0.5, -(-x), a - a and the like, operands of + and * ordered so that a*b and b*a are the
/// same node. A node only refers to nodes made before it, so the node order is an evaluation order.
///
/// Two rewritings keep derivatives cheap and finite: c ^ x = exp(x log c) for a constant c > 0, and
/// exp(x) ^ y = exp(x y). Simplified results may differ from the text's own order of operations
/// by rounding, and x * 0 is 0 also where x is not finite.
///
/// Domain: log and sqrt of a negative number and a negative number to a fractional power are NaN,
/// which whoever solves must treat as a state out of reach. Nothing here hides it.
class ExpressionGraph {
 public:
  enum class Op : std::uint8_t {
    constant,
    input,
    add,
    subtract,
    multiply,
    divide,
    power,
    negate,
    exp,
    log,
    sqrt,
    minimum,
    maximum,
    step,  ///< 0 for x < 0, else 1: only made by differentiating minimum and maximum
  };
  struct Node {
    Op op = Op::constant;
    NodeId a;            ///< first operand; for `input` a.value() is the input's number
    NodeId b;            ///< second operand of two-operand nodes
    double value = 0.0;  ///< of a constant
  };

  NodeId constant(double value);
  NodeId input(std::size_t number);
  NodeId add(NodeId a, NodeId b);
  NodeId subtract(NodeId a, NodeId b);
  NodeId multiply(NodeId a, NodeId b);
  NodeId divide(NodeId a, NodeId b);
  NodeId power(NodeId a, NodeId b);
  NodeId negate(NodeId a);
  NodeId exp(NodeId a);
  NodeId log(NodeId a);
  NodeId sqrt(NodeId a);
  NodeId minimum(NodeId a, NodeId b);
  NodeId maximum(NodeId a, NodeId b);
  /// The operation of a node (of this or another graph) on operands of this graph; leaves as they
  /// are.
  NodeId rebuild(const Node& node, NodeId a, NodeId b);

  /// Exact derivative of `of` with respect to an input, as a node of this graph (memoised). Finite
  /// wherever the function is smooth (x ^ 3 at 0); at a kink of minimum or maximum the derivative
  /// of the side where a >= b.
  NodeId derivative(NodeId of, std::size_t input_number);

  [[nodiscard]] const Node& node(NodeId id) const { return nodes_[id.value()]; }
  [[nodiscard]] std::size_t size() const { return nodes_.size(); }
  [[nodiscard]] bool is_constant(NodeId id) const { return node(id).op == Op::constant; }
  /// Numbers of the inputs a node depends on, rising.
  [[nodiscard]] std::vector<std::size_t> inputs_of(NodeId id) const;
  /// Plain evaluation of one node, for folding, audits and tests (the fast way is
  /// kinetics/tape.hpp).
  [[nodiscard]] double evaluate(NodeId id, std::span<const double> inputs) const;

  /// How many operands an operation has: 0, 1 or 2.
  [[nodiscard]] static int n_operands(Op op);
  /// The operation on numbers. min and max pass a NaN on.
  [[nodiscard]] static double apply(Op op, double a, double b);

 private:
  NodeId make(Op op, NodeId a, NodeId b, double value);
  NodeId step(NodeId a);
  /// The constant op(a, b) when both operands are constants and the result is finite.
  bool fold(Op op, NodeId a, NodeId b, NodeId& result);
  NodeId derivative_of_node(NodeId of, std::size_t input_number);
  NodeId derivative_of_function(NodeId of, NodeId da);
  NodeId derivative_of_power(NodeId of, NodeId da, NodeId db);
  [[nodiscard]] NodeId known_derivative(NodeId of, std::size_t input_number) const;

  std::vector<Node> nodes_;
  std::unordered_multimap<std::size_t, std::size_t> known_;
  std::unordered_map<std::uint64_t, NodeId> derivatives_;
};

}  // namespace stillzone::kinetics
