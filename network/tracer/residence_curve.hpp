#pragma once

#include <optional>
#include <span>
#include <string>
#include <vector>

namespace stillzone::network {

/// How the area under a sampled curve is taken. The rule moves the variance far more than the mean,
/// so every result names it.
enum class IntegrationRule {
  straight_lines,  ///< straight between samples, all integrals exact (the default)
  trapezoid,       ///< trapezoid on t^k C
  equal_step_sum,  ///< sum of t^k C times the step; equally spaced samples only
  simpson,         ///< Simpson's rule on t^k C over stretches of equal steps, else the trapezoid
};
[[nodiscard]] std::string rule_name(IntegrationRule rule);
/// The rule of a name ("straight lines", "trapezoid", "equal-step sum", "simpson").
[[nodiscard]] std::optional<IntegrationRule> rule_of(const std::string& name);
/// True when all steps agree to 1e-9 of the span: what equal_step_sum needs.
[[nodiscard]] bool equally_spaced(std::span<const double> ages);

/// A residence-time density known at nodes of age (any one time unit throughout), as sampled or
/// tabulated. Ages rising, at least two; densities >= 0 for the cumulative to rise, but noise below
/// zero is kept. Area > 0.
class ResidenceCurve {
 public:
  ResidenceCurve(std::vector<double> ages, std::vector<double> heights, IntegrationRule rule);

  [[nodiscard]] IntegrationRule rule() const { return rule_; }
  [[nodiscard]] std::span<const double> ages() const { return ages_; }
  /// Area under the heights as given.
  [[nodiscard]] double area() const { return area_; }
  /// E at the nodes: heights / area.
  [[nodiscard]] std::span<const double> density() const { return density_; }
  /// F at the nodes by straight lines between them, scaled to end at 1.
  [[nodiscard]] std::span<const double> cumulative() const { return cumulative_; }
  [[nodiscard]] double mean() const { return mean_; }
  [[nodiscard]] double variance() const { return variance_; }

  /// E and F between the nodes (straight lines, F the exact integral). 0 before, F = 1 after.
  [[nodiscard]] double density_at(double age) const;
  [[nodiscard]] double cumulative_at(double age) const;
  /// Age at which F reaches a share in (0, 1), exact for straight lines.
  [[nodiscard]] double quantile(double share) const;

  /// What is left of a first-order decay, exact for any mixing: integral of E exp(-k t), by the
  /// curve's rule. Source: Danckwerts (1953), Chem. Eng. Sci. 2:1.
  [[nodiscard]] double first_order_left(double k) const;
  /// What is left of a second-order decay c' = -k c0 c^2 (c relative to the feed) when the water
  /// stays segregated: integral of E / (1 + k c0 t).
  [[nodiscard]] double second_order_segregated(double k_c0) const;
  /// The same at maximum mixedness: dc/dl = k c0 c^2 - E/(1-F) (1 - c), from the oldest age down to
  /// 0. Source: Zwietering (1959), Chem. Eng. Sci. 11:1-15.
  [[nodiscard]] double second_order_maximum_mixedness(double k_c0) const;

 private:
  /// Integral of g(t) E dt by the rule, for g smooth over a step.
  template <class Function>
  [[nodiscard]] double integral(const Function& g) const;

  IntegrationRule rule_;
  std::vector<double> ages_;
  std::vector<double> density_;
  std::vector<double> cumulative_;
  std::vector<double> weights_;  ///< of the node sums; straight_lines: the trapezoid's
  double area_ = 0.0;
  double mean_ = 0.0;
  double variance_ = 0.0;
};

}  // namespace stillzone::network
