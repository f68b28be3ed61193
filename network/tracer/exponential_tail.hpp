#pragma once

#include <optional>
#include <span>

namespace stillzone::network {

/// One point of a falling curve, ages rising.
struct FallingPoint {
  double age = 0.0;     ///< [d]
  double height = 0.0;  ///< any unit; may be below zero
  double error = 0.0;   ///< same unit, standard deviation > 0
};

/// height exp(-rate (age - at)).
struct ExponentialTail {
  double at = 0.0;          ///< [d] age of the last point
  double height = 0.0;      ///< there
  double rate = 0.0;        ///< [1/d] > 0
  double rate_error = 0.0;  ///< [1/d] standard error, widened where the points scatter more than
                            ///< their errors say
  std::size_t n_points = 0;

  [[nodiscard]] double height_at(double age) const;
};

/// Weighted least squares of an exponential to the last points: about as few as tell the rate to 10
/// %, at least 6, at most all (3 suffice when there are no more). The heights themselves are
/// fitted, not their logarithms, so that points near and below zero pull neither way. Empty when
/// the points do not fall: rate - 2 rate_error <= 0 even with all of them.
[[nodiscard]] std::optional<ExponentialTail> fit_exponential_tail(
    std::span<const FallingPoint> points);

}  // namespace stillzone::network
