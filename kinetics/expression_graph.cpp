#include "kinetics/expression_graph.hpp"

#include <algorithm>
#include <bit>
#include <cmath>

#include "core/require.hpp"

namespace stillzone::kinetics {

namespace {

using Op = ExpressionGraph::Op;

bool is_exactly(double value, double target) { return !(value < target) && !(value > target); }

std::size_t mixed(std::size_t seed, std::size_t value) {
  return (seed ^ (value + 0x9e3779b97f4a7c15ULL + (seed << 6) + (seed >> 2))) *
         0xff51afd7ed558ccdULL;
}

std::size_t hash_of(const ExpressionGraph::Node& node) {
  std::size_t hash = mixed(0, static_cast<std::size_t>(node.op));
  hash = mixed(hash, node.a.value());
  hash = mixed(hash, node.b.value());
  return mixed(hash, std::bit_cast<std::uint64_t>(node.value));
}

bool same(const ExpressionGraph::Node& x, const ExpressionGraph::Node& y) {
  return x.op == y.op && x.a == y.a && x.b == y.b &&
         std::bit_cast<std::uint64_t>(x.value) == std::bit_cast<std::uint64_t>(y.value);
}

}  // namespace

int ExpressionGraph::n_operands(Op op) {
  switch (op) {
    case Op::constant:
    case Op::input:
      return 0;
    case Op::negate:
    case Op::exp:
    case Op::log:
    case Op::sqrt:
    case Op::step:
      return 1;
    case Op::add:
    case Op::subtract:
    case Op::multiply:
    case Op::divide:
    case Op::power:
    case Op::minimum:
    case Op::maximum:
      return 2;
  }
  return 0;
}

double ExpressionGraph::apply(Op op, double a, double b) {
  switch (op) {
    case Op::constant:
    case Op::input:
      return a;
    case Op::add:
      return a + b;
    case Op::subtract:
      return a - b;
    case Op::multiply:
      return a * b;
    case Op::divide:
      return a / b;
    case Op::power:
      return std::pow(a, b);
    case Op::negate:
      return -a;
    case Op::exp:
      return std::exp(a);
    case Op::log:
      return std::log(a);
    case Op::sqrt:
      return std::sqrt(a);
    case Op::minimum:
      return a < b || std::isnan(a) ? a : b;
    case Op::maximum:
      return a > b || std::isnan(a) ? a : b;
    case Op::step:
      return a < 0.0 ? 0.0 : 1.0;
  }
  return a;
}

NodeId ExpressionGraph::make(Op op, NodeId a, NodeId b, double value) {
  const Node node{op, a, b, value};
  const std::size_t hash = hash_of(node);
  const auto [first, last] = known_.equal_range(hash);
  for (auto it = first; it != last; ++it) {
    if (same(nodes_[it->second], node)) return NodeId(it->second);
  }
  nodes_.push_back(node);
  known_.emplace(hash, nodes_.size() - 1);
  return NodeId(nodes_.size() - 1);
}

bool ExpressionGraph::fold(Op op, NodeId a, NodeId b, NodeId& result) {
  if (!is_constant(a) || !is_constant(b)) return false;
  const double value = apply(op, node(a).value, node(b).value);
  if (!std::isfinite(value)) return false;
  result = constant(value);
  return true;
}

NodeId ExpressionGraph::constant(double value) {
  const double unsigned_zero = is_exactly(value, 0.0) ? 0.0 : value;
  return make(Op::constant, NodeId(), NodeId(), unsigned_zero);
}

NodeId ExpressionGraph::input(std::size_t number) {
  return make(Op::input, NodeId(number), NodeId(), 0.0);
}

NodeId ExpressionGraph::add(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::add, a, b, folded)) return folded;
  if (is_constant(b) || (!is_constant(a) && b < a)) std::swap(a, b);
  // From here on only `a` can be a constant; copies, since making a node moves the others.
  const Node x = node(a);
  const Node y = node(b);
  if (x.op == Op::constant) {
    if (is_exactly(x.value, 0.0)) return b;
    if (y.op == Op::add && is_constant(y.a)) {
      if (NodeId sum; fold(Op::add, a, y.a, sum)) return add(sum, y.b);
    }
    if (y.op == Op::subtract && is_constant(y.a)) {
      if (NodeId sum; fold(Op::add, a, y.a, sum)) return subtract(sum, y.b);
    }
  }
  if (a == b) return multiply(constant(2.0), a);
  if (x.op == Op::negate && y.op == Op::negate) return negate(add(x.a, y.a));
  if (y.op == Op::negate) return subtract(a, y.a);
  if (x.op == Op::negate) return subtract(b, x.a);
  return make(Op::add, a, b, 0.0);
}

NodeId ExpressionGraph::subtract(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::subtract, a, b, folded)) return folded;
  if (a == b) return constant(0.0);
  const Node x = node(a);
  const Node y = node(b);
  if (y.op == Op::constant) return add(constant(-y.value), a);
  if (x.op == Op::constant && is_exactly(x.value, 0.0)) return negate(b);
  if (y.op == Op::negate) return add(a, y.a);
  if (x.op == Op::negate) return negate(add(x.a, b));
  if (x.op == Op::constant && y.op == Op::add && is_constant(y.a)) {
    if (NodeId rest; fold(Op::subtract, a, y.a, rest)) return subtract(rest, y.b);
  }
  return make(Op::subtract, a, b, 0.0);
}

NodeId ExpressionGraph::multiply(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::multiply, a, b, folded)) return folded;
  if (is_constant(b) || (!is_constant(a) && b < a)) std::swap(a, b);
  const Node x = node(a);
  const Node y = node(b);
  if (x.op == Op::constant) {
    if (is_exactly(x.value, 0.0)) return a;
    if (is_exactly(x.value, 1.0)) return b;
    if (is_exactly(x.value, -1.0)) return negate(b);
    if (y.op == Op::negate) return multiply(constant(-x.value), y.a);
    if (y.op == Op::multiply && is_constant(y.a)) {
      NodeId product;
      // An underflow would lose what the two factors hold together.
      if (fold(Op::multiply, a, y.a, product) && std::isnormal(node(product).value)) {
        return multiply(product, y.b);
      }
    }
  }
  if (x.op == Op::negate && y.op == Op::negate) return multiply(x.a, y.a);
  if (y.op == Op::negate) return negate(multiply(a, y.a));
  if (x.op == Op::negate) return negate(multiply(x.a, b));
  return make(Op::multiply, a, b, 0.0);
}

NodeId ExpressionGraph::divide(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::divide, a, b, folded)) return folded;
  const Node x = node(a);
  const Node y = node(b);
  if (x.op == Op::constant && is_exactly(x.value, 0.0) && y.op != Op::constant) return a;
  if (y.op == Op::constant) {
    const double reciprocal = 1.0 / y.value;
    if (std::isnormal(reciprocal)) return multiply(constant(reciprocal), a);
  }
  if (x.op == Op::negate && y.op == Op::negate) return divide(x.a, y.a);
  if (x.op == Op::negate) return negate(divide(x.a, b));
  if (y.op == Op::negate) return negate(divide(a, y.a));
  return make(Op::divide, a, b, 0.0);
}

NodeId ExpressionGraph::power(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::power, a, b, folded)) return folded;
  const Node x = node(a);
  const Node y = node(b);
  if (y.op == Op::constant) {
    if (is_exactly(y.value, 0.0)) return constant(1.0);
    if (is_exactly(y.value, 1.0)) return a;
    if (is_exactly(y.value, 2.0)) return multiply(a, a);
    if (is_exactly(y.value, 0.5)) return sqrt(a);
    if (is_exactly(y.value, -1.0)) return divide(constant(1.0), a);
  }
  if (x.op == Op::constant && x.value > 0.0 && std::isfinite(x.value)) {
    return exp(multiply(constant(std::log(x.value)), b));
  }
  if (x.op == Op::exp) return exp(multiply(x.a, b));
  return make(Op::power, a, b, 0.0);
}

NodeId ExpressionGraph::negate(NodeId a) {
  const Node x = node(a);
  if (x.op == Op::constant) return constant(-x.value);
  if (x.op == Op::negate) return x.a;
  if (x.op == Op::subtract) return subtract(x.b, x.a);
  if (x.op == Op::multiply && is_constant(x.a)) {
    return multiply(constant(-node(x.a).value), x.b);
  }
  return make(Op::negate, a, NodeId(), 0.0);
}

NodeId ExpressionGraph::exp(NodeId a) {
  if (NodeId folded; fold(Op::exp, a, a, folded)) return folded;
  return make(Op::exp, a, NodeId(), 0.0);
}

NodeId ExpressionGraph::log(NodeId a) {
  if (NodeId folded; fold(Op::log, a, a, folded)) return folded;
  if (node(a).op == Op::exp) return node(a).a;
  return make(Op::log, a, NodeId(), 0.0);
}

NodeId ExpressionGraph::sqrt(NodeId a) {
  if (NodeId folded; fold(Op::sqrt, a, a, folded)) return folded;
  return make(Op::sqrt, a, NodeId(), 0.0);
}

NodeId ExpressionGraph::minimum(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::minimum, a, b, folded)) return folded;
  if (a == b) return a;
  if (b < a) std::swap(a, b);
  return make(Op::minimum, a, b, 0.0);
}

NodeId ExpressionGraph::maximum(NodeId a, NodeId b) {
  if (NodeId folded; fold(Op::maximum, a, b, folded)) return folded;
  if (a == b) return a;
  if (b < a) std::swap(a, b);
  return make(Op::maximum, a, b, 0.0);
}

NodeId ExpressionGraph::step(NodeId a) {
  if (NodeId folded; fold(Op::step, a, a, folded)) return folded;
  return make(Op::step, a, NodeId(), 0.0);
}

NodeId ExpressionGraph::rebuild(const Node& node, NodeId a, NodeId b) {
  switch (node.op) {
    case Op::constant:
      return constant(node.value);
    case Op::input:
      return input(node.a.value());
    case Op::add:
      return add(a, b);
    case Op::subtract:
      return subtract(a, b);
    case Op::multiply:
      return multiply(a, b);
    case Op::divide:
      return divide(a, b);
    case Op::power:
      return power(a, b);
    case Op::negate:
      return negate(a);
    case Op::exp:
      return exp(a);
    case Op::log:
      return log(a);
    case Op::sqrt:
      return sqrt(a);
    case Op::minimum:
      return minimum(a, b);
    case Op::maximum:
      return maximum(a, b);
    case Op::step:
      return step(a);
  }
  return a;
}

std::vector<std::size_t> ExpressionGraph::inputs_of(NodeId id) const {
  std::vector<bool> seen(id.value() + 1, false);
  std::vector<NodeId> open{id};
  std::vector<std::size_t> inputs;
  while (!open.empty()) {
    const NodeId next = open.back();
    open.pop_back();
    if (seen[next.value()]) continue;
    seen[next.value()] = true;
    const Node& n = node(next);
    if (n.op == Op::input) inputs.push_back(n.a.value());
    const int operands = n_operands(n.op);
    if (operands >= 1) open.push_back(n.a);
    if (operands == 2) open.push_back(n.b);
  }
  std::ranges::sort(inputs);
  return inputs;
}

double ExpressionGraph::evaluate(NodeId id, std::span<const double> inputs) const {
  SZ_REQUIRE(id.value() < size(), "node {} of {}", id.value(), size());
  std::vector<bool> needed(id.value() + 1, false);
  needed[id.value()] = true;
  for (std::size_t i = id.value() + 1; i-- > 0;) {
    if (!needed[i]) continue;
    const int operands = n_operands(nodes_[i].op);
    if (operands >= 1) needed[nodes_[i].a.value()] = true;
    if (operands == 2) needed[nodes_[i].b.value()] = true;
  }
  std::vector<double> values(id.value() + 1, 0.0);
  for (std::size_t i = 0; i <= id.value(); ++i) {
    if (!needed[i]) continue;
    const Node& n = nodes_[i];
    if (n.op == Op::constant) {
      values[i] = n.value;
    } else if (n.op == Op::input) {
      SZ_REQUIRE(n.a.value() < inputs.size(), "input {} of {}", n.a.value(), inputs.size());
      values[i] = inputs[n.a.value()];
    } else {
      values[i] = apply(n.op, values[n.a.value()], values[n.b.value()]);
    }
  }
  return values[id.value()];
}

}  // namespace stillzone::kinetics
