#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace stillzone::network {

/// What the residuals of a fit say about it.
struct ResidualTests {
  /// Wald and Wolfowitz (1940), Ann. Math. Stat. 11:147: chance of so few runs of one sign when the
  /// model is right. Empty with fewer than 8 residuals or all of one sign.
  std::optional<double> runs_p;
  std::size_t n_runs = 0;
  /// Chi-squared test of the scatter against the stated errors: chance of so much (or so little).
  double scatter_p = 1.0;
  /// The residual furthest out, beyond the 5 % limit for the largest of n (Student's t with
  /// Bonferroni's correction); empty when none is.
  std::optional<std::size_t> outlier;
  std::vector<std::string> words;  ///< in plain sentences, gravest first
};

/// @param residuals weighted, in time order, quantified samples only
/// @param degrees_of_freedom > 0
[[nodiscard]] ResidualTests residual_tests(std::span<const double> residuals,
                                           long degrees_of_freedom);

/// P(number of runs <= n_runs) in a random order of n_plus and n_minus signs, exact.
[[nodiscard]] double runs_at_most(std::size_t n_runs, std::size_t n_plus, std::size_t n_minus);

}  // namespace stillzone::network
