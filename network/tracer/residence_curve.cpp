#include "network/tracer/residence_curve.hpp"

#include <algorithm>
#include <array>
#include <boost/numeric/odeint.hpp>
#include <cmath>
#include <utility>

#include "core/require.hpp"

namespace stillzone::network {
namespace {

const std::array<std::pair<IntegrationRule, const char*>, 4> kRuleNames = {{
    {IntegrationRule::straight_lines, "straight lines"},
    {IntegrationRule::trapezoid, "trapezoid"},
    {IntegrationRule::equal_step_sum, "equal-step sum"},
    {IntegrationRule::simpson, "simpson"},
}};

std::vector<double> trapezoid_weights(const std::vector<double>& t) {
  std::vector<double> w(t.size(), 0.0);
  for (std::size_t i = 0; i + 1 < t.size(); ++i) {
    w[i] += 0.5 * (t[i + 1] - t[i]);
    w[i + 1] += 0.5 * (t[i + 1] - t[i]);
  }
  return w;
}

/// Simpson over pairs of equal steps; a step left over at the end of a stretch by the trapezoid.
std::vector<double> simpson_weights(const std::vector<double>& t) {
  std::vector<double> w(t.size(), 0.0);
  const double span = t.back() - t.front();
  std::size_t i = 0;
  while (i + 1 < t.size()) {
    const double h = t[i + 1] - t[i];
    if (i + 2 < t.size() && std::abs((t[i + 2] - t[i + 1]) - h) <= 1e-9 * span) {
      w[i] += h / 3.0;
      w[i + 1] += 4.0 * h / 3.0;
      w[i + 2] += h / 3.0;
      i += 2;
    } else {
      w[i] += 0.5 * h;
      w[i + 1] += 0.5 * h;
      i += 1;
    }
  }
  return w;
}

std::vector<double> rule_weights(const std::vector<double>& t, IntegrationRule rule) {
  switch (rule) {
    case IntegrationRule::simpson:
      return simpson_weights(t);
    case IntegrationRule::equal_step_sum:
      SZ_REQUIRE(equally_spaced(t), "{} samples are not equally spaced", t.size());
      return std::vector<double>(t.size(),
                                 (t.back() - t.front()) / static_cast<double>(t.size() - 1));
    case IntegrationRule::straight_lines:
    case IntegrationRule::trapezoid:
      break;
  }
  return trapezoid_weights(t);
}

/// Gauss-Legendre, 5 points: exact for polynomials to degree 9, so for the moments of straight
/// lines; beyond rounding for exponentials over a sampling step of moderate decay.
constexpr std::array<std::pair<double, double>, 5> kGauss = {{
    {0.0, 128.0 / 225.0},
    {-0.5384693101056831, 0.4786286704993665},
    {0.5384693101056831, 0.4786286704993665},
    {-0.9061798459386640, 0.2369268850561891},
    {0.9061798459386640, 0.2369268850561891},
}};

}  // namespace

std::string rule_name(IntegrationRule rule) {
  for (const auto& [known, name] : kRuleNames) {
    if (known == rule) return name;
  }
  return {};
}

std::optional<IntegrationRule> rule_of(const std::string& name) {
  for (const auto& [rule, known] : kRuleNames) {
    if (known == name) return rule;
  }
  return std::nullopt;
}

bool equally_spaced(std::span<const double> ages) {
  if (ages.size() < 2) return false;
  const double span = ages.back() - ages.front();
  const double step = span / static_cast<double>(ages.size() - 1);
  for (std::size_t i = 0; i + 1 < ages.size(); ++i) {
    if (std::abs(ages[i + 1] - ages[i] - step) > 1e-9 * span) return false;
  }
  return true;
}

template <class Function>
double ResidenceCurve::integral(const Function& g) const {
  double sum = 0.0;
  if (rule_ != IntegrationRule::straight_lines) {
    for (std::size_t i = 0; i < ages_.size(); ++i) sum += weights_[i] * g(ages_[i]) * density_[i];
    return sum;
  }
  for (std::size_t i = 0; i + 1 < ages_.size(); ++i) {
    const double half = 0.5 * (ages_[i + 1] - ages_[i]);
    const double middle = 0.5 * (ages_[i + 1] + ages_[i]);
    for (const auto& [x, w] : kGauss) {
      const double line = 0.5 * ((1.0 - x) * density_[i] + (1.0 + x) * density_[i + 1]);
      sum += half * w * g(middle + half * x) * line;
    }
  }
  return sum;
}

ResidenceCurve::ResidenceCurve(std::vector<double> ages, std::vector<double> heights,
                               IntegrationRule rule)
    : rule_(rule), ages_(std::move(ages)), density_(std::move(heights)) {
  SZ_REQUIRE(ages_.size() >= 2 && ages_.size() == density_.size(), "{} ages, {} heights",
             ages_.size(), density_.size());
  weights_ = rule_weights(ages_, rule);
  for (std::size_t i = 0; i < ages_.size(); ++i) area_ += weights_[i] * density_[i];
  SZ_REQUIRE(area_ > 0.0, "area {}", area_);
  for (double& height : density_) height /= area_;
  cumulative_.assign(ages_.size(), 0.0);
  for (std::size_t i = 1; i < ages_.size(); ++i) {
    cumulative_[i] =
        cumulative_[i - 1] + 0.5 * (ages_[i] - ages_[i - 1]) * (density_[i] + density_[i - 1]);
  }
  for (double& share : cumulative_) share /= cumulative_.back();
  mean_ = integral([](double t) { return t; });
  const double centre = mean_;
  variance_ = integral([centre](double t) { return (t - centre) * (t - centre); });
}

double ResidenceCurve::density_at(double age) const {
  if (age < ages_.front() || age > ages_.back()) return 0.0;
  const auto next = std::upper_bound(ages_.begin(), ages_.end(), age);
  if (next == ages_.end()) return density_.back();
  const auto i = static_cast<std::size_t>(next - ages_.begin());
  const double share = (age - ages_[i - 1]) / (ages_[i] - ages_[i - 1]);
  return (1.0 - share) * density_[i - 1] + share * density_[i];
}

double ResidenceCurve::cumulative_at(double age) const {
  if (age <= ages_.front()) return 0.0;
  if (age >= ages_.back()) return 1.0;
  const auto next = std::upper_bound(ages_.begin(), ages_.end(), age);
  const auto i = static_cast<std::size_t>(next - ages_.begin());
  const double step = age - ages_[i - 1];
  const double share = step / (ages_[i] - ages_[i - 1]);
  const double here = (1.0 - share) * density_[i - 1] + share * density_[i];
  const double whole = 0.5 * (ages_[i] - ages_[i - 1]) * (density_[i] + density_[i - 1]);
  const double part = 0.5 * step * (density_[i - 1] + here);
  if (!(std::abs(whole) > 0.0)) return cumulative_[i - 1];
  return cumulative_[i - 1] + (cumulative_[i] - cumulative_[i - 1]) * part / whole;
}

double ResidenceCurve::quantile(double share) const {
  SZ_REQUIRE(share > 0.0 && share < 1.0, "share {}", share);
  for (std::size_t i = 1; i < ages_.size(); ++i) {
    if (cumulative_[i] < share) continue;
    // Along the step F rises by (d x + s x^2 / 2) in proportion, x the time into the step.
    const double h = ages_[i] - ages_[i - 1];
    const double whole = 0.5 * h * (density_[i] + density_[i - 1]);
    const double wanted =
        whole * (share - cumulative_[i - 1]) / (cumulative_[i] - cumulative_[i - 1]);
    const double d = density_[i - 1];
    const double slope = (density_[i] - d) / h;
    const double root = std::sqrt(std::max(d * d + 2.0 * slope * wanted, 0.0));
    return ages_[i - 1] + std::clamp(2.0 * wanted / (d + root), 0.0, h);
  }
  return ages_.back();
}

double ResidenceCurve::first_order_left(double k) const {
  return integral([k](double t) { return std::exp(-k * t); });
}

double ResidenceCurve::second_order_segregated(double k_c0) const {
  return integral([k_c0](double t) { return 1.0 / (1.0 + k_c0 * t); });
}

double ResidenceCurve::second_order_maximum_mixedness(double k_c0) const {
  namespace odeint = boost::numeric::odeint;
  // Start where next to nothing is older; the equation forgets its start on the way down.
  const double oldest = quantile(1.0 - 1e-9);
  std::array<double, 1> left = {1.0};
  const auto slope = [&](const std::array<double, 1>& c, std::array<double, 1>& rate, double age) {
    const double older = std::max(1.0 - cumulative_at(age), 1e-12);
    rate[0] = k_c0 * c[0] * c[0] - density_at(age) / older * (1.0 - c[0]);
  };
  using Stepper = odeint::runge_kutta_dopri5<std::array<double, 1>>;
  odeint::integrate_adaptive(odeint::make_controlled<Stepper>(1e-10, 1e-10), slope, left, oldest,
                             0.0, -1e-4 * oldest);
  return left[0];
}

}  // namespace stillzone::network
