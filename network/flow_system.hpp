#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

namespace stillzone::network {

/// The linear equations of a flow balance, solved once for good.
///   sum_j factor_j * x_j = 0   for every row
/// Some variables are known (given flows, feed rates), the others follow from them. Rows with one
/// unknown are peeled off in turn, then columns that stand in one row only; what is left (loops of
/// shares) falls into independent cores, each factored: dense with pivoting when small, sparse when
/// large. A solution then costs one substitution. Immutable; safe for concurrent use.
class FlowSystem {
 public:
  struct Term {
    std::size_t variable = 0;
    double factor = 0.0;
  };
  using Row = std::vector<Term>;

  /// @param known one per variable
  /// @param rows  terms of the same variable are added up
  FlowSystem(std::vector<Row> rows, std::vector<bool> known);
  ~FlowSystem();
  FlowSystem(const FlowSystem&) = delete;
  FlowSystem& operator=(const FlowSystem&) = delete;

  /// Fills in the unknown variables. @param x one per variable, the known ones set
  /// Rows that contradict each other are met in the least-squares sense or left unmet.
  void substitute(std::span<double> x) const;

  /// How many variables remain free (0: determined).
  [[nodiscard]] std::size_t n_free() const;
  /// Ways in which the unknowns can move with the known ones fixed: the variables with their
  /// relative change. At most `most` of the n_free() independent ones.
  [[nodiscard]] std::vector<std::vector<Term>> free_directions(std::size_t most) const;

  [[nodiscard]] std::span<const Row> rows() const { return rows_; }
  /// |sum| of a row over its largest term; 0 when |sum| is not above `rounding`.
  [[nodiscard]] double relative_residual(std::size_t row, std::span<const double> x,
                                         double rounding) const;
  [[nodiscard]] std::size_t n_terms() const { return n_terms_; }

 private:
  struct Step {
    std::size_t row = 0;
    std::size_t variable = 0;
    double factor = 0.0;  ///< of the variable in the row
  };
  struct Core;
  struct Peeling;

  void run(std::span<const Step> steps, std::span<double> x) const;
  void build_cores(const Peeling& peeling);

  std::vector<Row> rows_;
  std::vector<bool> known_;
  std::size_t n_terms_ = 0;
  std::vector<Step> first_;  ///< rows with one unknown, in order
  std::vector<Core> cores_;
  std::vector<Step> last_;         ///< columns of one row, in the order to solve
  std::vector<std::size_t> open_;  ///< unknowns that no row fixes
};

}  // namespace stillzone::network
