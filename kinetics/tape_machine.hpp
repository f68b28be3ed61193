#pragma once

#include <cstddef>

#include "kinetics/tape.hpp"

namespace stillzone::kinetics {

/// One tile of a tape run: where each lane's rows are. Row pointers: [array * Tape::kMaxWidth +
/// lane].
struct TapeTile {
  const TapeInstruction* first = nullptr;
  const TapeInstruction* last = nullptr;
  const double* constants = nullptr;
  double* slots = nullptr;  ///< slot s, lane l: slots[s * width + l]; aligned to 64 bytes
  const double* const* inputs = nullptr;
  double* const* outputs = nullptr;
};

/// The same kernel compiled for one machine, per tile width.
struct TapeMachineCode {
  void (*width_1)(const TapeTile&) = nullptr;
  void (*width_4)(const TapeTile&) = nullptr;
  void (*width_8)(const TapeTile&) = nullptr;
  void (*width_16)(const TapeTile&) = nullptr;
};

/// Plain C++ for any processor.
[[nodiscard]] const TapeMachineCode& portable_machine_code();
/// AVX2 and FMA; null when the build or this processor has none.
[[nodiscard]] const TapeMachineCode* avx2_machine_code();

}  // namespace stillzone::kinetics
