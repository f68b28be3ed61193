#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <string>

#include "core/dae/sparse_pattern.hpp"
#include "core/result.hpp"

namespace stillzone::core {

/// A sparse index-1 DAE  M y' = f(y),  M = diag(1 for differential unknowns, 0 for algebraic ones),
/// autonomous between known switch times. Beside it run quadratures q' = g(y) that nothing depends
/// on (what has flowed in and out), integrated by the same formula as y, so that a linear
/// invariant of y and q is kept to rounding or to the Newton tolerance.
///
/// One object serves one thread (evaluations use scratch of the object). Time unit: day.
class DaeSystem {
 public:
  DaeSystem() = default;
  virtual ~DaeSystem() = default;
  DaeSystem(const DaeSystem&) = delete;
  DaeSystem& operator=(const DaeSystem&) = delete;

  [[nodiscard]] virtual std::size_t n_unknowns() const = 0;
  [[nodiscard]] virtual std::size_t n_quadratures() const = 0;
  /// 1 for a differential unknown, 0 for an algebraic one; size n_unknowns.
  [[nodiscard]] virtual std::span<const std::uint8_t> differential() const = 0;
  /// A magnitude of each unknown below which its relative error does not matter, > 0. The absolute
  /// tolerance of unknown i is relative_tolerance * floors()[i].
  [[nodiscard]] virtual std::span<const double> floors() const = 0;
  /// Pattern of df/dy, the same for all switch states.
  [[nodiscard]] virtual const SparsePattern& pattern() const = 0;

  /// f(y), size n_unknowns; every entry is written. May write non-finite values (a trial state far
  /// out): the integrator then tries a smaller step.
  virtual void rates(std::span<const double> y, std::span<double> f) = 0;
  /// df/dy at the positions of pattern(); every entry is written. Exact.
  virtual void jacobian(std::span<const double> y, std::span<double> values) = 0;
  /// g(y), size n_quadratures.
  virtual void quadrature_rates(std::span<const double> y, std::span<double> g) = 0;
  /// (dg/dy) v, size n_quadratures. Exact.
  virtual void quadrature_rates_along(std::span<const double> y, std::span<const double> v,
                                      std::span<double> gv) = 0;

  /// First time strictly after t at which f changes by a switch; none when it never does again.
  [[nodiscard]] virtual std::optional<double> next_switch(double t) const = 0;
  /// Sets f to what holds in the interval that starts at t (right-continuous). Switches leave the
  /// differential unknowns as they are.
  virtual void enter(double t) = 0;
  /// Which kind of interval was entered last (a number per combination of switch states): what
  /// was learnt about step sizes is kept per kind.
  [[nodiscard]] virtual std::size_t interval_kind() const = 0;

  /// Solves the algebraic unknowns for given differential ones; y in and out.
  virtual Result<Done> make_consistent(std::span<double> y) = 0;

  /// For messages: where an unknown sits ("zone rim") and what it is ("S_ac").
  [[nodiscard]] virtual std::string unknown_place(std::size_t i) const = 0;
  [[nodiscard]] virtual std::string unknown_quantity(std::size_t i) const = 0;
};

}  // namespace stillzone::core
