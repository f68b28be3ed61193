#pragma once

#include <cstddef>
#include <span>
#include <utility>

#include "core/dae/sundials_compat.hpp"

namespace stillzone::core {

/// A serial SUNDIALS vector, owned, whose operations are ours: distributions ship SUNDIALS without
/// optimisation, and its vector loops are then half the run time on small systems (measured). The
/// clones SUNDIALS makes inherit the operations. Sums run in a fixed order.
class FastVector {
 public:
  FastVector(std::size_t n, SUNContext context);
  ~FastVector();
  FastVector(const FastVector&) = delete;
  FastVector& operator=(const FastVector&) = delete;

  [[nodiscard]] N_Vector get() const { return vector_; }
  [[nodiscard]] std::span<double> values() const;

 private:
  N_Vector vector_;
};

/// The numbers of a serial vector.
[[nodiscard]] std::span<double> values_of(N_Vector vector);

}  // namespace stillzone::core
