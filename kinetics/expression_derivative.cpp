// Symbolic differentiation: the second half of kinetics/expression_graph.hpp.
#include <vector>

#include "core/require.hpp"
#include "kinetics/expression_graph.hpp"

namespace stillzone::kinetics {

namespace {

std::uint64_t memo_key(NodeId of, std::size_t input_number) {
  const std::uint64_t node_number = of.value();
  return (node_number << 24U) | input_number;
}

}  // namespace

NodeId ExpressionGraph::known_derivative(NodeId of, std::size_t input_number) const {
  return derivatives_.at(memo_key(of, input_number));
}

NodeId ExpressionGraph::derivative(NodeId of, std::size_t input_number) {
  SZ_REQUIRE(of.value() < size() && input_number < (1U << 24U), "node {} of {}, input {}",
             of.value(), size(), input_number);
  // Operands first, without recursion: a chain of terms may be as long as a model likes.
  std::vector<NodeId> open{of};
  while (!open.empty()) {
    const NodeId next = open.back();
    if (derivatives_.contains(memo_key(next, input_number))) {
      open.pop_back();
      continue;
    }
    const Node n = node(next);
    const int operands = n_operands(n.op);
    bool ready = true;
    if (operands >= 1 && !derivatives_.contains(memo_key(n.a, input_number))) {
      open.push_back(n.a);
      ready = false;
    }
    if (operands == 2 && !derivatives_.contains(memo_key(n.b, input_number))) {
      open.push_back(n.b);
      ready = false;
    }
    if (!ready) continue;
    open.pop_back();
    derivatives_.emplace(memo_key(next, input_number), derivative_of_node(next, input_number));
  }
  return known_derivative(of, input_number);
}

NodeId ExpressionGraph::derivative_of_node(NodeId of, std::size_t input_number) {
  const Node n = node(of);
  const int operands = n_operands(n.op);
  const NodeId zero = constant(0.0);
  const NodeId da = operands >= 1 ? known_derivative(n.a, input_number) : zero;
  const NodeId db = operands == 2 ? known_derivative(n.b, input_number) : zero;
  switch (n.op) {
    case Op::constant:
      return zero;
    case Op::input:
      return constant(n.a.value() == input_number ? 1.0 : 0.0);
    case Op::add:
      return add(da, db);
    case Op::subtract:
      return subtract(da, db);
    case Op::multiply:
      return add(multiply(da, n.b), multiply(n.a, db));
    case Op::divide:  // (a/b)' = (a' - (a/b) b') / b: shares a/b and has no b^2 to overflow
      return divide(subtract(da, multiply(of, db)), n.b);
    case Op::power:
      return derivative_of_power(of, da, db);
    case Op::minimum:  // a' where a < b, else b'
      return add(da, multiply(subtract(db, da), step(subtract(n.a, n.b))));
    case Op::maximum:
      return add(db, multiply(subtract(da, db), step(subtract(n.a, n.b))));
    case Op::negate:
    case Op::exp:
    case Op::log:
    case Op::sqrt:
    case Op::step:
      return derivative_of_function(of, da);
  }
  return zero;
}

NodeId ExpressionGraph::derivative_of_function(NodeId of, NodeId da) {
  const Node n = node(of);
  if (n.op == Op::negate) return negate(da);
  if (n.op == Op::exp) return multiply(of, da);
  if (n.op == Op::log) return divide(da, n.a);
  if (n.op == Op::sqrt) return divide(multiply(constant(0.5), da), of);
  return constant(0.0);  // step: flat on both sides
}

NodeId ExpressionGraph::derivative_of_power(NodeId of, NodeId da, NodeId db) {
  const Node n = node(of);
  // b a^(b-1) a' rather than a^b b/a a', which is 0/0 at a = 0.
  const NodeId base_part = multiply(multiply(n.b, power(n.a, add(n.b, constant(-1.0)))), da);
  const NodeId exponent_part = multiply(multiply(of, log(n.a)), db);
  return add(base_part, exponent_part);
}

}  // namespace stillzone::kinetics
