#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "kinetics/expression_graph.hpp"

namespace stillzone::kinetics {

/// Operations of a tape; k is the instruction's constant.
enum class TapeOp : std::uint16_t {
  load1,
  load4,  ///< 1 or 4 neighbouring values of a zone's row into slots
  store1,
  store4,  ///< slots into 1 or 4 neighbouring values of a zone's row
  set,     ///< k
  add,
  subtract,
  multiply,
  divide,
  negate,
  reciprocal,
  sqrt,
  exp,
  log,
  power,
  minimum,
  maximum,
  step,
  add_k,                ///< a + k
  subtract_from_k,      ///< k - a
  multiply_k,           ///< k a
  divide_k,             ///< k / a
  multiply_add,         ///< a b + c
  multiply_subtract,    ///< a b - c
  subtract_product,     ///< c - a b
  multiply_k_add,       ///< k a + b
  multiply_k_subtract,  ///< k a - b
  multiply_add_k,       ///< a b + k
  k_subtract_product,   ///< k - a b
};

/// One step: slot numbers; `array` and `k` are the row and the offset in it of a load or store,
/// else `k` is the number of the constant.
struct TapeInstruction {
  TapeOp op = TapeOp::set;
  std::uint16_t d = 0;
  std::uint16_t a = 0;
  std::uint16_t b = 0;
  std::uint16_t c = 0;
  std::uint16_t array = 0;
  std::uint32_t k = 0;
};

/// Ties a node to a place in the rows a tape reads or writes: row `array`, position `offset`.
struct TapePlace {
  NodeId node;
  std::uint16_t array = 0;
  std::size_t offset = 0;
};

/// Zone-major rows: zone z has data[z * stride] .. data[z * stride + width - 1]. Stride 0 gives
/// every zone the same row.
struct TapeInput {
  const double* data = nullptr;
  std::size_t stride = 0;
};
struct TapeOutput {
  double* data = nullptr;
  std::size_t stride = 0;
};

/// Scratch of a tape, in cache lines.
struct alignas(64) TapeScratchLine {
  std::array<double, 8> values;
};

/// Which machine code runs the tape. Both do the same operations in the same order; `portable` has
/// no fused multiply-add, so results agree to rounding, not to the digit.
enum class TapeMachine { automatic, portable };

/// Expressions compiled for evaluation over many zones: the needed nodes of a graph in a good
/// order, products and sums fused, small integer powers multiplied out, divisions by the same
/// denominator made one reciprocal, slots reused as soon as their value is spent.
///
/// Zones run in tiles of up to 16 lanes. A zone's digits do not depend on the number of zones or on
/// its place among them: every width does the same arithmetic (exp included, which is ours,
/// accurate to 1 ulp or so). log and powers with other exponents are the C library's, zone by zone.
class Tape {
 public:
  static constexpr std::size_t kMaxWidth = 16;
  static constexpr std::size_t kMaxInputs = 3;
  static constexpr std::size_t kMaxOutputs = 2;

  /// @param leaves nodes read from the input rows (inputs, or whole subexpressions known before);
  ///   list every position of a row, needed or not, so that its width is known
  /// @param roots nodes to compute, in the order of work; neighbours should share operands
  Tape(const ExpressionGraph& graph, std::span<const TapePlace> leaves,
       std::span<const TapePlace> roots, TapeMachine machine = TapeMachine::automatic);

  /// Evaluates n zones. Output rows must not overlap input rows.
  /// @param scratch at least scratch_lines()
  void run(std::size_t n, std::span<const TapeInput> inputs, std::span<const TapeOutput> outputs,
           std::span<TapeScratchLine> scratch) const;

  [[nodiscard]] std::size_t scratch_lines() const;
  [[nodiscard]] std::size_t n_slots() const { return n_slots_; }
  [[nodiscard]] const std::vector<TapeInstruction>& instructions() const { return instructions_; }

 private:
  std::vector<TapeInstruction> instructions_;
  std::vector<double> constants_;
  std::size_t n_slots_ = 0;
  std::size_t output_width_ = 0;
  TapeMachine machine_ = TapeMachine::automatic;
};

}  // namespace stillzone::kinetics
