#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>

#include "core/dae/sparse_pattern.hpp"

namespace stillzone::core {

/// Solves (D - J) x = b with D diagonal and J on a fixed sparse pattern: the one linear problem of
/// the integrators (D = M c) and of the steady-state search (D = M / pseudo-step, or 0).
class LinearSolver {
 public:
  LinearSolver() = default;
  virtual ~LinearSolver() = default;
  LinearSolver(const LinearSolver&) = delete;
  LinearSolver& operator=(const LinearSolver&) = delete;

  /// @param diagonal size n; @param jacobian size pattern.n_entries().
  /// @return false when the matrix is singular or not finite; `singular_column` then tells where.
  [[nodiscard]] virtual bool factor(std::span<const double> diagonal,
                                    std::span<const double> jacobian) = 0;
  /// In place; needs a successful factor() before.
  virtual void solve(std::span<double> b) = 0;
  /// Column at which the last factor() gave up; meaningless after success.
  [[nodiscard]] virtual std::int64_t singular_column() const = 0;
  [[nodiscard]] virtual std::string name() const = 0;

  std::size_t n_factorisations = 0;
  std::size_t n_solves = 0;
};

/// SuiteSparse KLU, AMD ordering (the orderings aware of zone blocks measured worse).
[[nodiscard]] std::unique_ptr<LinearSolver> make_klu_solver(const SparsePattern& pattern);

}  // namespace stillzone::core
