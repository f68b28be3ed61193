#pragma once

#include <array>
#include <cstdint>
#include <map>
#include <span>
#include <unordered_map>
#include <vector>

#include "kinetics/expression_graph.hpp"
#include "kinetics/tape.hpp"

namespace stillzone::kinetics {

/// Turns nodes into instructions: first into steps on numbered values, then into slots.
class TapeCompiler {
 public:
  TapeCompiler(const ExpressionGraph& graph, std::span<const TapePlace> leaves,
               std::span<const TapePlace> roots);

  std::vector<TapeInstruction> instructions;
  std::vector<double> constants;
  std::size_t n_slots = 0;

 private:
  using Value = std::uint32_t;
  using Op = ExpressionGraph::Op;
  static constexpr Value kNone = 0xffffffffU;

  struct Step {
    TapeOp op = TapeOp::set;
    std::uint16_t array = 0;
    std::uint32_t k = 0;
    std::uint8_t n_results = 0;
    std::uint8_t n_operands = 0;
    std::array<Value, 4> results{};
    std::array<Value, 4> operands{};
  };
  /// A node that is a product: constant times x, x times y, or either times 1 / y.
  struct Product {
    bool has_constant = false;
    double constant = 0.0;
    NodeId x;
    NodeId y;
    bool has_y = false;
    bool y_is_denominator = false;
  };
  /// How a sum or difference is done: one side may be a product that is fused into it.
  struct SumPlan {
    bool fused = false;
    bool product_is_first = false;  ///< in a difference: product - other
    NodeId product;
    NodeId other;
  };

  void count_uses(std::span<const TapePlace> roots);
  void lower(NodeId root);
  [[nodiscard]] std::vector<NodeId> operands_of(NodeId id) const;
  [[nodiscard]] bool is_fusable_product(NodeId id) const;
  [[nodiscard]] Product product_of(NodeId id) const;
  [[nodiscard]] SumPlan plan_of(NodeId id) const;

  Value emit_node(NodeId id);
  Value emit_sum(NodeId id);
  Value emit_fused_sum(NodeId id, const SumPlan& plan);
  Value emit_product(const Product& product);
  Value emit_quotient(NodeId id);
  Value emit_power(NodeId id);
  Value integer_power(Value base, int exponent);
  Value emit(TapeOp op, std::array<Value, 3> operands, std::size_t n_operands, double k = 0.0,
             bool has_k = false);
  Value unary(TapeOp op, Value a) { return emit(op, {a, 0, 0}, 1); }
  Value binary(TapeOp op, Value a, Value b) { return emit(op, {a, b, 0}, 2); }
  Value unary_k(TapeOp op, Value a, double k) { return emit(op, {a, 0, 0}, 1, k, true); }
  Value binary_k(TapeOp op, Value a, Value b, double k) { return emit(op, {a, b, 0}, 2, k, true); }
  Value second_factor(const Product& product);
  Value value_of(NodeId id);
  Value set_constant(double k);
  std::uint32_t constant_number(double k);
  Value load(const TapePlace& place);
  void store(std::span<const TapePlace> roots);
  void allocate_slots();

  const ExpressionGraph& graph_;
  std::vector<const TapePlace*> leaf_of_;  ///< by node
  std::vector<std::uint32_t> uses_;        ///< by node
  std::vector<std::uint32_t> divisions_;   ///< by node: quotients it is the denominator of
  std::vector<Value> value_of_;            ///< by node
  std::array<std::size_t, Tape::kMaxInputs> input_width_{};
  std::map<std::array<std::uint32_t, 5>, Value> known_;
  std::map<std::uint64_t, std::uint32_t> constant_numbers_;
  std::map<std::pair<std::uint16_t, std::size_t>, Value> loaded_;
  std::vector<Step> steps_;
  Value n_values_ = 0;
};

}  // namespace stillzone::kinetics
