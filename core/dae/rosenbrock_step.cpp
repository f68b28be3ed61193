#include "core/dae/rosenbrock_step.hpp"

#include <algorithm>
#include <array>
#include <cmath>

#include "core/dae/evaluation.hpp"
#include "core/dae/rodas4_coefficients.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

constexpr std::size_t kStages = rodas4::kStages;
constexpr rodas4::Weights kQuadrature = rodas4::quadrature_weights(rodas4::kM);
constexpr rodas4::Weights kQuadrature2 = rodas4::quadrature_weights(rodas4::kD2);
constexpr rodas4::Weights kQuadrature3 = rodas4::quadrature_weights(rodas4::kD3);

/// out = base + sum_{j<N} weights[j] * column j of u, columns of length n behind each other.
template <std::size_t N>
void add_columns(const double* base, const double* u, std::size_t n, const double* weights,
                 double* __restrict out) {
  std::array<double, N> w{};
  for (std::size_t j = 0; j < N; ++j) w[j] = weights[j];
  for (std::size_t i = 0; i < n; ++i) {
    double sum = base[i];
    for (std::size_t j = 0; j < N; ++j) sum += w[j] * u[j * n + i];
    out[i] = sum;
  }
}

/// out += mass * sum_{j<N} weights[j] * column j of u.
template <std::size_t N>
void add_weighted_columns(const double* mass, const double* u, std::size_t n, const double* weights,
                          double* __restrict out) {
  std::array<double, N> w{};
  for (std::size_t j = 0; j < N; ++j) w[j] = weights[j];
  for (std::size_t i = 0; i < n; ++i) {
    double sum = 0.0;
    for (std::size_t j = 0; j < N; ++j) sum += w[j] * u[j * n + i];
    out[i] += mass[i] * sum;
  }
}

}  // namespace

RosenbrockStep::RosenbrockStep(DaeSystem& system, LinearSolver& solver, double relative_tolerance)
    : system_(system),
      solver_(solver),
      relative_tolerance_(relative_tolerance),
      n_(system.n_unknowns()),
      n_quadratures_(system.n_quadratures()),
      mass_(n_),
      floors_(system.floors().begin(), system.floors().end()),
      diagonal_(n_),
      jacobian_(static_cast<std::size_t>(system.pattern().n_entries())),
      f0_(n_),
      y1_(n_),
      zeros_(n_),
      direction_(n_),
      states_(kStages * n_),
      u_(kStages * n_),
      g_(kStages * n_quadratures_),
      increment_(n_quadratures_),
      dense2_(n_quadratures_),
      dense3_(n_quadratures_),
      along_(n_quadratures_) {
  SZ_REQUIRE(n_ > 0 && floors_.size() == n_ && system.differential().size() == n_,
             "unknowns {}, floors {}, differential {}", n_, floors_.size(),
             system.differential().size());
  std::ranges::copy(system.differential(), mass_.begin());
  for (const double floor : floors_) SZ_REQUIRE(floor > 0.0, "floor {}", floor);
}

RosenbrockStep::Outcome RosenbrockStep::begin(std::span<const double> y) {
  SZ_REQUIRE(y.size() == n_, "y {} of {}", y.size(), n_);
  std::ranges::copy(y, states_.begin());
  evaluate_rates(system_, y, f0_);
  ++rate_calls;
  if (const auto i = first_not_finite(f0_)) {
    culprit_ = *i;
    return Outcome::not_finite;
  }
  evaluate_jacobian(system_, y, jacobian_);
  ++jacobian_calls;
  return Outcome::done;
}

template <int Stage>
void RosenbrockStep::stage(double h) {
  constexpr auto kN = static_cast<std::size_t>(Stage);
  const std::span<double> u{u_.data() + kN * n_, n_};
  if constexpr (Stage == 0) {
    std::ranges::copy(f0_, u.begin());
  } else {
    const std::span<double> at{states_.data() + kN * n_, n_};
    add_columns<kN>(states_.data(), u_.data(), n_, rodas4::kA[kN].data(), at.data());
    evaluate_rates(system_, at, u);
    ++rate_calls;
    std::array<double, kN> c{};
    for (std::size_t j = 0; j < kN; ++j) c[j] = rodas4::kC[kN][j] / h;
    add_weighted_columns<kN>(mass_.data(), u_.data(), n_, c.data(), u.data());
  }
  solver_.solve(u);
}

RosenbrockStep::Outcome RosenbrockStep::attempt(double h) {
  h_ = h;
  dense_ready_ = false;
  const double scale = 1.0 / (h * rodas4::kGamma);
  for (std::size_t i = 0; i < n_; ++i) diagonal_[i] = mass_[i] * scale;
  if (!solver_.factor(diagonal_, jacobian_)) {
    culprit_ = static_cast<std::size_t>(solver_.singular_column());
    return all_finite(jacobian_) ? Outcome::singular : Outcome::not_finite;
  }
  stage<0>(h);
  stage<1>(h);
  stage<2>(h);
  stage<3>(h);
  stage<4>(h);
  stage<5>(h);
  const double* last = u_.data() + (kStages - 1) * n_;
  const double* before = states_.data() + (kStages - 1) * n_;
  for (std::size_t i = 0; i < n_; ++i) y1_[i] = before[i] + last[i];
  estimate_error();
  if (std::isfinite(error_)) return Outcome::done;
  find_culprit();
  return Outcome::not_finite;
}

/// The solves spread one bad number over all unknowns: asks the model again, stage by stage.
void RosenbrockStep::find_culprit() {
  culprit_ = first_not_finite(y1_).value_or(0);
  for (std::size_t j = 1; j < kStages; ++j) {
    const std::span<const double> at{states_.data() + j * n_, n_};
    if (!all_finite(at)) return;
    evaluate_rates(system_, at, direction_);
    ++rate_calls;
    if (const auto i = first_not_finite(direction_)) {
      culprit_ = *i;
      return;
    }
  }
}

void RosenbrockStep::estimate_error() {
  const double* last = u_.data() + (kStages - 1) * n_;
  double sum = 0.0;
  for (std::size_t i = 0; i < n_; ++i) {
    const double size = std::max(std::abs(states_[i]), std::abs(y1_[i])) + floors_[i];
    const double weighted = last[i] / size;
    sum += weighted * weighted;
  }
  error_ = std::sqrt(sum / static_cast<double>(n_)) / relative_tolerance_;
}

std::size_t RosenbrockStep::worst_unknown() const {
  const double* last = u_.data() + (kStages - 1) * n_;
  std::size_t worst = 0;
  double largest = -1.0;
  for (std::size_t i = 0; i < n_; ++i) {
    const double weighted =
        std::abs(last[i]) / (std::max(std::abs(states_[i]), std::abs(y1_[i])) + floors_[i]);
    if (weighted > largest) {
      largest = weighted;
      worst = i;
    }
  }
  return worst;
}

void RosenbrockStep::weigh_quadratures(std::span<const double> weights, std::span<double> sum) {
  add_columns<kStages>(zeros_.data(), u_.data(), n_, weights.data(), direction_.data());
  system_.quadrature_rates_along(std::span<const double>{states_.data(), n_}, direction_, along_);
  for (std::size_t k = 0; k < n_quadratures_; ++k) {
    double total = along_[k];
    for (std::size_t j = 0; j < kStages; ++j) total += weights[j] * g_[j * n_quadratures_ + k];
    sum[k] = h_ * total;
  }
}

void RosenbrockStep::advance_quadratures(std::span<double> q) {
  if (n_quadratures_ == 0) return;
  for (std::size_t j = 0; j < kStages; ++j) {
    evaluate_quadratures(system_, std::span<const double>{states_.data() + j * n_, n_},
                         std::span<double>{g_.data() + j * n_quadratures_, n_quadratures_});
  }
  weigh_quadratures(kQuadrature, increment_);
  for (std::size_t k = 0; k < n_quadratures_; ++k) q[k] += increment_[k];
}

void RosenbrockStep::dense_state(double s, std::span<double> y) const {
  const double r = 1.0 - s;
  for (std::size_t i = 0; i < n_; ++i) {
    double d2 = 0.0;
    double d3 = 0.0;
    for (std::size_t j = 0; j + 1 < kStages; ++j) {
      d2 += rodas4::kD2[j] * u_[j * n_ + i];
      d3 += rodas4::kD3[j] * u_[j * n_ + i];
    }
    y[i] = r * states_[i] + s * (y1_[i] + r * (d2 + s * d3));
  }
}

void RosenbrockStep::dense_quadratures(double s, std::span<const double> q_start,
                                       std::span<double> q) {
  if (n_quadratures_ == 0) return;
  if (!dense_ready_) {
    weigh_quadratures(kQuadrature2, dense2_);
    weigh_quadratures(kQuadrature3, dense3_);
    dense_ready_ = true;
  }
  for (std::size_t k = 0; k < n_quadratures_; ++k) {
    q[k] = q_start[k] + s * (increment_[k] + (1.0 - s) * (dense2_[k] + s * dense3_[k]));
  }
}

}  // namespace stillzone::core
