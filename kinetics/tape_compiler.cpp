#include "kinetics/tape_compiler.hpp"

#include <algorithm>
#include <bit>
#include <cmath>

#include "core/require.hpp"

namespace stillzone::kinetics {

namespace {

constexpr double kLargestExpandedPower = 32.0;

bool is_small_integer(double value) {
  return std::abs(value) <= kLargestExpandedPower &&
         std::abs(value - std::nearbyint(value)) < 1e-300;
}

bool is_one(double value) { return !(value < 1.0) && !(value > 1.0); }

}  // namespace

TapeCompiler::TapeCompiler(const ExpressionGraph& graph, std::span<const TapePlace> leaves,
                           std::span<const TapePlace> roots)
    : graph_(graph),
      leaf_of_(graph.size(), nullptr),
      uses_(graph.size(), 0),
      divisions_(graph.size(), 0),
      value_of_(graph.size(), kNone) {
  for (const TapePlace& leaf : leaves) {
    SZ_REQUIRE(leaf.array < Tape::kMaxInputs, "input row {}", leaf.array);
    leaf_of_[leaf.node.value()] = &leaf;
    input_width_[leaf.array] = std::max(input_width_[leaf.array], leaf.offset + 1);
  }
  count_uses(roots);
  for (std::size_t i = 0; i < roots.size();) {
    // Four neighbours leave together: they are then transposed as one block.
    const bool four = i + 3 < roots.size() && roots[i + 3].array == roots[i].array &&
                      roots[i + 3].offset == roots[i].offset + 3 &&
                      roots[i + 1].offset == roots[i].offset + 1 &&
                      roots[i + 2].offset == roots[i].offset + 2;
    const std::size_t count = four ? 4 : 1;
    for (std::size_t j = i; j < i + count; ++j) lower(roots[j].node);
    store(roots.subspan(i, count));
    i += count;
  }
  allocate_slots();
}

void TapeCompiler::count_uses(std::span<const TapePlace> roots) {
  std::size_t top = 0;
  for (const TapePlace& root : roots) {
    ++uses_[root.node.value()];
    top = std::max(top, root.node.value() + 1);
  }
  for (std::size_t i = top; i-- > 0;) {
    if (uses_[i] == 0 || leaf_of_[i] != nullptr) continue;
    const ExpressionGraph::Node& n = graph_.node(NodeId(i));
    const int operands = ExpressionGraph::n_operands(n.op);
    if (operands >= 1) ++uses_[n.a.value()];
    if (operands == 2) ++uses_[n.b.value()];
    if (n.op == Op::divide) ++divisions_[n.b.value()];
  }
}

void TapeCompiler::lower(NodeId root) {
  std::vector<NodeId> open{root};
  while (!open.empty()) {
    const NodeId next = open.back();
    if (value_of_[next.value()] != kNone || graph_.is_constant(next)) {
      open.pop_back();
      continue;
    }
    const std::vector<NodeId> operands = operands_of(next);
    bool ready = true;
    for (auto it = operands.rbegin(); it != operands.rend(); ++it) {  // the first one first
      if (value_of_[it->value()] == kNone && !graph_.is_constant(*it)) {
        open.push_back(*it);
        ready = false;
      }
    }
    if (!ready) continue;
    open.pop_back();
    value_of_[next.value()] = emit_node(next);
  }
}

bool TapeCompiler::is_fusable_product(NodeId id) const {
  if (leaf_of_[id.value()] != nullptr || uses_[id.value()] != 1) return false;
  const ExpressionGraph::Node& n = graph_.node(id);
  return n.op == Op::multiply || (n.op == Op::divide && divisions_[n.b.value()] > 1);
}

TapeCompiler::Product TapeCompiler::product_of(NodeId id) const {
  const ExpressionGraph::Node& n = graph_.node(id);
  Product product;
  if (graph_.is_constant(n.a)) {
    product.has_constant = true;
    product.constant = graph_.node(n.a).value;
  } else {
    product.x = n.a;
  }
  product.y = n.b;
  product.has_y = true;
  product.y_is_denominator = n.op == Op::divide;
  return product;
}

TapeCompiler::SumPlan TapeCompiler::plan_of(NodeId id) const {
  const ExpressionGraph::Node& n = graph_.node(id);
  const auto fits = [this](NodeId product, NodeId other) {
    if (!is_fusable_product(product)) return false;
    // k x + k' has no instruction of its own.
    return !(graph_.is_constant(other) && graph_.is_constant(graph_.node(product).a));
  };
  if (fits(n.b, n.a)) return {true, false, n.b, n.a};
  if (fits(n.a, n.b)) return {true, true, n.a, n.b};
  return {};
}

std::vector<NodeId> TapeCompiler::operands_of(NodeId id) const {
  if (leaf_of_[id.value()] != nullptr) return {};
  const ExpressionGraph::Node& n = graph_.node(id);
  if (n.op == Op::add || n.op == Op::subtract) {
    if (const SumPlan plan = plan_of(id); plan.fused) {
      const Product product = product_of(plan.product);
      if (product.has_constant) return {plan.other, product.y};
      return {plan.other, product.x, product.y};
    }
  }
  const int operands = ExpressionGraph::n_operands(n.op);
  if (operands == 0) return {};
  if (operands == 1) return {n.a};
  return {n.a, n.b};
}

TapeCompiler::Value TapeCompiler::value_of(NodeId id) {
  if (graph_.is_constant(id)) return set_constant(graph_.node(id).value);
  return value_of_[id.value()];
}

TapeCompiler::Value TapeCompiler::emit_node(NodeId id) {
  if (const TapePlace* leaf = leaf_of_[id.value()]) return load(*leaf);
  const ExpressionGraph::Node& n = graph_.node(id);
  switch (n.op) {
    case Op::constant:
      return set_constant(n.value);
    case Op::input:
      SZ_REQUIRE(false, "input {} has no place in a row", n.a.value());
      return kNone;
    case Op::add:
    case Op::subtract:
      return emit_sum(id);
    case Op::multiply:
      return emit_product(product_of(id));
    case Op::divide:
      return emit_quotient(id);
    case Op::power:
      return emit_power(id);
    case Op::negate:
      return unary(TapeOp::negate, value_of(n.a));
    case Op::exp:
      return unary(TapeOp::exp, value_of(n.a));
    case Op::log:
      return unary(TapeOp::log, value_of(n.a));
    case Op::sqrt:
      return unary(TapeOp::sqrt, value_of(n.a));
    case Op::minimum:
      return binary(TapeOp::minimum, value_of(n.a), value_of(n.b));
    case Op::maximum:
      return binary(TapeOp::maximum, value_of(n.a), value_of(n.b));
    case Op::step:
      return unary(TapeOp::step, value_of(n.a));
  }
  return kNone;
}

TapeCompiler::Value TapeCompiler::second_factor(const Product& product) {
  const Value y = value_of(product.y);
  return product.y_is_denominator ? unary(TapeOp::reciprocal, y) : y;
}

TapeCompiler::Value TapeCompiler::emit_product(const Product& product) {
  const Value y = second_factor(product);
  if (!product.has_constant) return binary(TapeOp::multiply, value_of(product.x), y);
  return is_one(product.constant) ? y : unary_k(TapeOp::multiply_k, y, product.constant);
}

TapeCompiler::Value TapeCompiler::emit_quotient(NodeId id) {
  const ExpressionGraph::Node& n = graph_.node(id);
  if (divisions_[n.b.value()] > 1) return emit_product(product_of(id));
  const Value denominator = value_of(n.b);
  if (!graph_.is_constant(n.a)) return binary(TapeOp::divide, value_of(n.a), denominator);
  const double k = graph_.node(n.a).value;
  if (is_one(k)) return unary(TapeOp::reciprocal, denominator);
  return unary_k(TapeOp::divide_k, denominator, k);
}

TapeCompiler::Value TapeCompiler::emit_sum(NodeId id) {
  if (const SumPlan plan = plan_of(id); plan.fused) return emit_fused_sum(id, plan);
  const ExpressionGraph::Node& n = graph_.node(id);
  const bool sum = n.op == Op::add;
  if (graph_.is_constant(n.a)) {
    return unary_k(sum ? TapeOp::add_k : TapeOp::subtract_from_k, value_of(n.b),
                   graph_.node(n.a).value);
  }
  return binary(sum ? TapeOp::add : TapeOp::subtract, value_of(n.a), value_of(n.b));
}

TapeCompiler::Value TapeCompiler::emit_fused_sum(NodeId id, const SumPlan& plan) {
  const bool sum = graph_.node(id).op == Op::add;
  const bool product_minus_other = !sum && plan.product_is_first;
  const Product product = product_of(plan.product);
  const Value y = second_factor(product);
  if (product.has_constant) {
    const Value other = value_of(plan.other);
    if (product_minus_other) {
      return binary_k(TapeOp::multiply_k_subtract, y, other, product.constant);
    }
    return binary_k(TapeOp::multiply_k_add, y, other, sum ? product.constant : -product.constant);
  }
  const Value x = value_of(product.x);
  if (graph_.is_constant(plan.other) && !product_minus_other) {
    return binary_k(sum ? TapeOp::multiply_add_k : TapeOp::k_subtract_product, x, y,
                    graph_.node(plan.other).value);
  }
  const TapeOp op = sum                   ? TapeOp::multiply_add
                    : product_minus_other ? TapeOp::multiply_subtract
                                          : TapeOp::subtract_product;
  return emit(op, {x, y, value_of(plan.other)}, 3);
}

TapeCompiler::Value TapeCompiler::emit_power(NodeId id) {
  const ExpressionGraph::Node& n = graph_.node(id);
  const Value base = value_of(n.a);
  if (graph_.is_constant(n.b) && is_small_integer(graph_.node(n.b).value)) {
    const int exponent = static_cast<int>(std::lround(graph_.node(n.b).value));
    const Value positive = integer_power(base, std::abs(exponent));
    return exponent < 0 ? unary(TapeOp::reciprocal, positive) : positive;
  }
  return binary(TapeOp::power, base, value_of(n.b));
}

TapeCompiler::Value TapeCompiler::integer_power(Value base, int exponent) {
  if (exponent == 0) return set_constant(1.0);
  if (exponent == 1) return base;
  const Value half = integer_power(base, exponent / 2);
  const Value square = binary(TapeOp::multiply, half, half);
  return exponent % 2 == 0 ? square : binary(TapeOp::multiply, square, base);
}

std::uint32_t TapeCompiler::constant_number(double k) {
  const auto next = static_cast<std::uint32_t>(constants.size());
  const auto [it, is_new] = constant_numbers_.emplace(std::bit_cast<std::uint64_t>(k), next);
  if (is_new) constants.push_back(k);
  return it->second;
}

TapeCompiler::Value TapeCompiler::set_constant(double k) {
  return emit(TapeOp::set, {0, 0, 0}, 0, k, true);
}

TapeCompiler::Value TapeCompiler::emit(TapeOp op, std::array<Value, 3> operands,
                                       std::size_t n_operands, double k, bool has_k) {
  if (op == TapeOp::multiply && operands[1] < operands[0]) std::swap(operands[0], operands[1]);
  const std::uint32_t number = has_k ? constant_number(k) : kNone;
  const std::array<std::uint32_t, 5> key{static_cast<std::uint32_t>(op), operands[0], operands[1],
                                         operands[2], number};
  if (const auto known = known_.find(key); known != known_.end()) return known->second;
  Step step;
  step.op = op;
  step.k = has_k ? number : 0;
  step.n_results = 1;
  step.n_operands = static_cast<std::uint8_t>(n_operands);
  step.results[0] = n_values_++;
  for (std::size_t i = 0; i < n_operands; ++i) step.operands[i] = operands[i];
  steps_.push_back(step);
  known_.emplace(key, step.results[0]);
  return step.results[0];
}

TapeCompiler::Value TapeCompiler::load(const TapePlace& place) {
  const auto known = loaded_.find({place.array, place.offset});
  if (known != loaded_.end()) return known->second;
  const std::size_t first = place.offset / 4 * 4;
  const bool four = first + 3 < input_width_[place.array];
  Step step;
  step.op = four ? TapeOp::load4 : TapeOp::load1;
  step.array = place.array;
  step.k = static_cast<std::uint32_t>(four ? first : place.offset);
  step.n_results = four ? 4 : 1;
  for (std::uint8_t i = 0; i < step.n_results; ++i) {
    step.results[i] = n_values_++;
    loaded_[{place.array, step.k + i}] = step.results[i];
  }
  steps_.push_back(step);
  return loaded_.at({place.array, place.offset});
}

void TapeCompiler::store(std::span<const TapePlace> roots) {
  Step step;
  step.op = roots.size() == 4 ? TapeOp::store4 : TapeOp::store1;
  step.array = roots[0].array;
  step.k = static_cast<std::uint32_t>(roots[0].offset);
  step.n_operands = static_cast<std::uint8_t>(roots.size());
  for (std::size_t i = 0; i < roots.size(); ++i) step.operands[i] = value_of(roots[i].node);
  steps_.push_back(step);
}

void TapeCompiler::allocate_slots() {
  constexpr std::size_t kNever = static_cast<std::size_t>(-1);
  std::vector<std::size_t> last_use(n_values_, kNever);
  for (std::size_t i = 0; i < steps_.size(); ++i) {
    for (std::size_t j = 0; j < steps_[i].n_operands; ++j) last_use[steps_[i].operands[j]] = i;
  }
  std::vector<std::uint16_t> slot(n_values_, 0);
  std::vector<std::uint16_t> spare;  // the last one freed is the next one used: it is in the cache
  instructions.reserve(steps_.size());
  for (std::size_t i = 0; i < steps_.size(); ++i) {
    const Step& step = steps_[i];
    std::array<std::uint16_t, 4> slots{};
    const std::size_t first_operand = step.n_results;
    for (std::size_t j = 0; j < step.n_operands; ++j) {
      const Value operand = step.operands[j];
      slots[first_operand + j] = slot[operand];
      // A result may take the slot of an operand: lanes are read before they are written.
      if (last_use[operand] == i) {
        spare.push_back(slot[operand]);
        last_use[operand] = kNever;
      }
    }
    for (std::size_t j = 0; j < step.n_results; ++j) {
      if (spare.empty()) {
        SZ_REQUIRE(n_slots < 0xffff, "{} slots", n_slots);
        spare.push_back(static_cast<std::uint16_t>(n_slots++));
      }
      slots[j] = slot[step.results[j]] = spare.back();
      spare.pop_back();
    }
    for (std::size_t j = 0; j < step.n_results; ++j) {
      if (last_use[step.results[j]] == kNever) spare.push_back(slots[j]);
    }
    instructions.push_back({step.op, slots[0], slots[1], slots[2], slots[3], step.array, step.k});
  }
}

}  // namespace stillzone::kinetics
