#pragma once

#include <cstddef>
#include <functional>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "core/result.hpp"

namespace stillzone::core {

/// One fitted parameter and its bounds (open ends: +-infinity).
struct FitParameter {
  std::string name;
  double start = 0.0;
  double low = 0.0;
  double high = 0.0;
};

/// Weighted residuals r(p) and their exact Jacobian. Thread-safe for concurrent const calls.
class ResidualFunction {
 public:
  ResidualFunction() = default;
  virtual ~ResidualFunction() = default;
  ResidualFunction(const ResidualFunction&) = delete;
  ResidualFunction& operator=(const ResidualFunction&) = delete;

  [[nodiscard]] virtual std::size_t n_residuals() const = 0;
  [[nodiscard]] virtual std::size_t n_parameters() const = 0;
  /// Residuals that count as observations for the degrees of freedom: one that only says "below the
  /// detection limit" does not.
  [[nodiscard]] virtual std::size_t n_observations() const { return n_residuals(); }
  /// @param jacobian row after row, n_residuals * n_parameters; empty when not wanted.
  /// @return false when the model cannot be evaluated at these parameters.
  [[nodiscard]] virtual bool evaluate(std::span<const double> parameters,
                                      std::span<double> residuals,
                                      std::span<double> jacobian) const = 0;
};

struct LeastSquaresOptions {
  enum class Loss { squares, huber, soft_l1 };
  Loss loss = Loss::squares;
  double loss_scale = 2.0;  ///< in units of the weighted residual (its standard deviation)
  int most_iterations = 500;
  /// Relative change of the cost below which a fit is finished. The default is near rounding: what
  /// the NIST reference sets need to reach their certified digits.
  double tolerance = 1e-16;
  /// A solution at which some parameter has no effect (a plateau) is a Failure, unless the caller
  /// asks to see it: then LeastSquaresFit::without_effect tells which.
  bool accept_plateau = false;
  /// Tries each start with a bold and a timid first step; false: only the bold one (refits that
  /// start next to the solution).
  bool timid_steps_too = true;
  /// Further starting points besides the parameters' own; each as long as the parameters. All are
  /// followed loosely (1e-8), the best of them to the end.
  std::vector<std::vector<double>> more_starts;
};

struct LeastSquaresFit {
  std::vector<double> parameters;
  std::vector<double> residuals;     ///< weighted, without the loss
  std::vector<double> jacobian;      ///< at the solution, row after row
  double sum_of_squares = 0.0;       ///< of the residuals
  std::size_t n_observations = 0;    ///< of the function
  std::vector<bool> at_bound;        ///< one per parameter
  std::vector<bool> without_effect;  ///< one per parameter; only with accept_plateau
  int iterations = 0;
  std::size_t starts_tried = 0;     ///< a start counts twice when bold and timid steps are tried
  std::size_t starts_agreeing = 0;  ///< that reached this minimum
  /// Some other start ended elsewhere with the same sum of squares (to 1e-5): not the only
  /// solution.
  bool ambiguous = false;
  std::string ended;  ///< why it stopped, with the numbers
};

/// Bounded, optionally robust least squares (Ceres, trust region), the best of several starts.
/// Failure when no start converged: never returned as a fit.
[[nodiscard]] Result<LeastSquaresFit> fit_least_squares(const ResidualFunction& function,
                                                        std::span<const FitParameter> parameters,
                                                        const LeastSquaresOptions& options);

/// Uncertainty of a fit by linearisation: covariance = s^2 (J'J)^-1 with s^2 = sum of squares /
/// degrees of freedom (as R's nls), parameters at a bound left out (variance 0, flagged).
struct FitUncertainty {
  std::vector<double> covariance;      ///< p * p
  std::vector<double> standard_error;  ///< p; infinite where not determined
  std::vector<double> correlation;     ///< p * p
  double residual_deviation = 0.0;     ///< s
  long degrees_of_freedom = 0;
  std::vector<double> singular_values;  ///< of the column-scaled Jacobian, falling
  bool singular = false;                ///< some combination of parameters is not determined
};
[[nodiscard]] FitUncertainty fit_uncertainty(const LeastSquaresFit& fit, std::size_t n_parameters);

/// Profile-likelihood interval of one parameter: where the best fit with it held fixed has
/// (S(p) - S_min) / s^2 = F(confidence; 1, df). An end that lies beyond the bounds is empty.
struct ProfileInterval {
  std::optional<double> low;
  std::optional<double> high;
  bool better_minimum_found = false;  ///< the profile went below the fit: the fit was local
};
[[nodiscard]] ProfileInterval profile_interval(const ResidualFunction& function,
                                               std::span<const FitParameter> parameters,
                                               const LeastSquaresFit& fit, std::size_t parameter,
                                               double confidence,
                                               const LeastSquaresOptions& options);

/// Corrected Akaike criterion of Gaussian residuals with unknown variance:
///   n (ln(2 pi S / n) + 1) + 2 k + 2 k (k + 1) / (n - k - 1),  k = parameters + 1.
/// Source: Hurvich and Tsai (1989), Biometrika 76:297. Infinite when n <= k + 1.
[[nodiscard]] double corrected_akaike(double sum_of_squares, std::size_t n_residuals,
                                      std::size_t n_parameters);

}  // namespace stillzone::core
