#pragma once

#include <algorithm>
#include <cmath>

namespace stillzone::core {

/// Step sizes of a method of order 4 with an embedded estimate of order 3: err ~ h^4, accepted when
/// err <= 1. After the second accepted step the predictive controller of Gustafsson (1994) also
/// looks at the last two errors.
/// Source: Hairer and Wanner, Solving ODEs II (1996), Section IV.8, eq. (8.20) and (8.21).
class StepController {
 public:
  /// At a switch: errors from before it say nothing about what comes.
  void restart() {
    last_step_ = 0.0;
    after_rejection_ = false;
  }
  [[nodiscard]] double after_accepted(double h, double error) {
    double growth = plain(error);
    if (last_step_ > 0.0) {
      const double predicted =
          kSafety * (h / last_step_) * std::pow(last_error_ / (floor(error) * floor(error)), 0.25);
      growth = std::min(growth, std::clamp(predicted, kLeast, kMost));
    }
    if (after_rejection_) growth = std::min(growth, 1.0);
    last_step_ = h;
    last_error_ = std::max(1e-2, error);
    after_rejection_ = false;
    return h * growth;
  }
  [[nodiscard]] double after_rejected(double h, double error) {
    after_rejection_ = true;
    return h * std::min(0.9, plain(error));
  }
  [[nodiscard]] double after_invalid(double h) {
    after_rejection_ = true;
    return 0.2 * h;
  }
  /// The step that would have just met the tolerance, with the usual margin.
  [[nodiscard]] static double fitting_step(double h, double error) { return h * plain(error); }

 private:
  static constexpr double kSafety = 0.9;
  static constexpr double kLeast = 0.2;
  static constexpr double kMost = 6.0;

  static double floor(double error) { return std::max(1e-10, error); }
  static double plain(double error) {
    return std::clamp(kSafety * std::pow(floor(error), -0.25), kLeast, kMost);
  }

  double last_step_ = 0.0;
  double last_error_ = 1.0;
  bool after_rejection_ = false;
};

}  // namespace stillzone::core
