#include "kinetics/tape.hpp"

#include <algorithm>

#include "core/require.hpp"
#include "kinetics/tape_compiler.hpp"
#include "kinetics/tape_machine.hpp"

namespace stillzone::kinetics {

namespace {

constexpr std::size_t kLineSize = std::tuple_size_v<decltype(TapeScratchLine::values)>;

struct TileShape {
  std::size_t width = 0;
  void (*run)(const TapeTile&) = nullptr;
};

/// The narrowest tile that takes what is left.
TileShape shape_for(std::size_t left, const TapeMachineCode& code) {
  if (left == 1) return {1, code.width_1};
  if (left <= 4) return {4, code.width_4};
  if (left <= 8) return {8, code.width_8};
  return {16, code.width_16};
}

}  // namespace

Tape::Tape(const ExpressionGraph& graph, std::span<const TapePlace> leaves,
           std::span<const TapePlace> roots, TapeMachine machine)
    : machine_(machine) {
  TapeCompiler compiler(graph, leaves, roots);
  instructions_ = std::move(compiler.instructions);
  constants_ = std::move(compiler.constants);
  n_slots_ = compiler.n_slots;
  // Instructions without a constant point at one all the same.
  if (constants_.empty()) constants_.push_back(0.0);
  for (const TapePlace& root : roots) {
    SZ_REQUIRE(root.array < kMaxOutputs, "output row {}", root.array);
    output_width_ = std::max(output_width_, root.offset + 1);
  }
}

std::size_t Tape::scratch_lines() const {
  return (std::max<std::size_t>(n_slots_, 1) * kMaxWidth + output_width_ + kLineSize) / kLineSize;
}

void Tape::run(std::size_t n, std::span<const TapeInput> inputs,
               std::span<const TapeOutput> outputs, std::span<TapeScratchLine> scratch) const {
  SZ_REQUIRE(inputs.size() <= kMaxInputs && outputs.size() <= kMaxOutputs, "{} {}", inputs.size(),
             outputs.size());
  SZ_REQUIRE(scratch.size() >= scratch_lines(), "{} {}", scratch.size(), scratch_lines());
  const TapeMachineCode* fast = machine_ == TapeMachine::automatic ? avx2_machine_code() : nullptr;
  const TapeMachineCode& code = fast != nullptr ? *fast : portable_machine_code();
  double* slots = scratch.front().values.data();
  double* unused_row = slots + n_slots_ * kMaxWidth;
  std::array<const double*, kMaxInputs * kMaxWidth> input_rows{};
  std::array<double*, kMaxOutputs * kMaxWidth> output_rows{};
  TapeTile tile{instructions_.data(), instructions_.data() + instructions_.size(),
                constants_.data(),    slots,
                input_rows.data(),    output_rows.data()};
  for (std::size_t z = 0; z < n;) {
    const TileShape shape = shape_for(n - z, code);
    const std::size_t n_real = std::min(shape.width, n - z);
    // Lanes beyond the last zone compute that zone again and drop the result.
    for (std::size_t r = 0; r < inputs.size(); ++r) {
      for (std::size_t l = 0; l < shape.width; ++l) {
        input_rows[r * kMaxWidth + l] =
            inputs[r].data + (z + std::min(l, n_real - 1)) * inputs[r].stride;
      }
    }
    for (std::size_t r = 0; r < outputs.size(); ++r) {
      for (std::size_t l = 0; l < shape.width; ++l) {
        output_rows[r * kMaxWidth + l] =
            l < n_real ? outputs[r].data + (z + l) * outputs[r].stride : unused_row;
      }
    }
    shape.run(tile);
    z += n_real;
  }
}

}  // namespace stillzone::kinetics
