#include "core/dae/rosenbrock_step.hpp"

#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <cmath>
#include <memory>

#include "tests/unit/core/dae_systems_support.hpp"

namespace stillzone::core {
namespace {

using test::FunctionSystem;

/// x' = -x / z, 0 = z^2 - x * e, e' = -e from (1, 1, 1), index 1. With x = z^2 / e:
/// 2 z z' / e + z^2 / e = -z / e, so 2 z' = -1 - z and z = 2 exp(-t / 2) - 1, e = exp(-t).
/// Quadrature: q' = z^2, q = -4 exp(-t) + 8 exp(-t / 2) + t - 4.
std::unique_ptr<FunctionSystem> exact_dae() {
  auto system = std::make_unique<FunctionSystem>(
      3,
      [](std::span<const double> y, std::span<double> f) {
        f[0] = -y[0] / y[1];
        f[1] = y[1] * y[1] - y[0] * y[2];
        f[2] = -y[2];
      },
      [](std::span<const double> y, Eigen::MatrixXd& j) {
        j << -1.0 / y[1], y[0] / (y[1] * y[1]), 0.0,  //
            -y[2], 2.0 * y[1], -y[0],                 //
            0.0, 0.0, -1.0;
      });
  system->differential_flags = {1, 0, 1};
  system->quadratures = 1;
  system->quadrature = [](std::span<const double> y, std::span<double> g) { g[0] = y[1] * y[1]; };
  system->quadrature_along = [](std::span<const double> y, std::span<const double> v,
                                std::span<double> gv) { gv[0] = 2.0 * y[1] * v[1]; };
  return system;
}

double z_at(double t) { return 2.0 * std::exp(-0.5 * t) - 1.0; }
double x_at(double t) { return z_at(t) * z_at(t) * std::exp(t); }
double q_at(double t) { return -4.0 * std::exp(-t) + 8.0 * std::exp(-0.5 * t) + t - 4.0; }

struct Errors {
  double x = 0.0, z = 0.0, q = 0.0, dense_z = 0.0, dense_q = 0.0;
};

/// n equal steps to t = 1; the dense errors at 0.3 of the last step.
Errors errors_with(int n) {
  auto system = exact_dae();
  auto solver = make_klu_solver(system->pattern());
  RosenbrockStep step(*system, *solver, 1e-6);
  std::vector<double> y = {1.0, 1.0, 1.0};
  std::vector<double> q = {0.0};
  std::vector<double> q_before = {0.0};
  const double h = 1.0 / n;
  for (int k = 0; k < n; ++k) {
    EXPECT_EQ(step.begin(y), RosenbrockStep::Outcome::done);
    EXPECT_EQ(step.attempt(h), RosenbrockStep::Outcome::done);
    q_before = q;
    step.advance_quadratures(q);
    y.assign(step.state().begin(), step.state().end());
  }
  std::vector<double> inside(3);
  std::vector<double> q_inside(1);
  step.dense_state(0.3, inside);
  step.dense_quadratures(0.3, q_before, q_inside);
  const double t = 1.0 - 0.7 * h;
  return {std::abs(y[0] - x_at(1.0)), std::abs(y[1] - z_at(1.0)), std::abs(q[0] - q_at(1.0)),
          std::abs(inside[1] - z_at(t)), std::abs(q_inside[0] - q_at(t))};
}

// Observed order over two halvings of the step, in the range where the leading term rules and
// rounding does not: the shortfall of 0.2 allows for the next term.
double order(double coarse, double fine) { return 0.5 * std::log2(coarse / fine); }

TEST(RosenbrockStep, HasOrderFourForDifferentialAlgebraicAndQuadrature) {
  const Errors coarse = errors_with(80);
  const Errors fine = errors_with(320);
  EXPECT_GT(order(coarse.x, fine.x), 3.8);
  EXPECT_GT(order(coarse.z, fine.z), 3.8);
  EXPECT_GT(order(coarse.q, fine.q), 3.8);
  EXPECT_LT(fine.x, 1e-11);
}

TEST(RosenbrockStep, DenseOutputHasOrderThreeAtLeast) {
  const Errors coarse = errors_with(80);
  const Errors fine = errors_with(320);
  EXPECT_GT(order(coarse.dense_z, fine.dense_z), 2.8);
  EXPECT_GT(order(coarse.dense_q, fine.dense_q), 2.8);
  EXPECT_LT(fine.dense_z, 1e-8);
}

TEST(RosenbrockStep, DenseOutputMeetsBothEnds) {
  auto system = exact_dae();
  auto solver = make_klu_solver(system->pattern());
  RosenbrockStep step(*system, *solver, 1e-6);
  const std::vector<double> y = {1.0, 1.0, 1.0};
  ASSERT_EQ(step.begin(y), RosenbrockStep::Outcome::done);
  ASSERT_EQ(step.attempt(0.1), RosenbrockStep::Outcome::done);
  std::vector<double> inside(3);
  step.dense_state(0.0, inside);
  EXPECT_EQ(inside, y);
  step.dense_state(1.0, inside);
  for (std::size_t i = 0; i < 3; ++i) EXPECT_DOUBLE_EQ(inside[i], step.state()[i]);
}

}  // namespace
}  // namespace stillzone::core
