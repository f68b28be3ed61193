#include "core/dae/steady_state.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <cmath>

#include "tests/unit/core/dae_systems_support.hpp"

namespace stillzone::core {
namespace {

using test::FunctionSystem;
using test::linear_system;
using testing::HasSubstr;

Result<SteadyReport> find(DaeSystem& system, std::vector<double>& y, SteadyOptions options = {}) {
  auto solver = make_klu_solver(system.pattern());
  return find_steady_state(system, *solver, options, y);
}

/// A chemostat of one group: substrate s, biomass x, Monod growth with yield 1.
///   s' = d (s_in - s) - mu x,  x' = (mu - d) x,  mu = mu_max s / (k + s).
/// Exact: washed out (s_in, 0), or s = k d / (mu_max - d), x = s_in - s.
std::unique_ptr<FunctionSystem> chemostat(double d, double mu_max, double k, double s_in) {
  return std::make_unique<FunctionSystem>(
      2,
      [=](std::span<const double> y, std::span<double> f) {
        const double mu = mu_max * y[0] / (k + y[0]);
        f[0] = d * (s_in - y[0]) - mu * y[1];
        f[1] = (mu - d) * y[1];
      },
      [=](std::span<const double> y, Eigen::MatrixXd& j) {
        const double mu = mu_max * y[0] / (k + y[0]);
        const double slope = mu_max * k / ((k + y[0]) * (k + y[0]));
        j << -d - slope * y[1], -mu, slope * y[1], mu - d;
      });
}

TEST(SteadyState, OfALinearSystemTakesOneNewtonStepAndOneToConfirm) {
  Eigen::MatrixXd a(2, 2);
  a << -3.0, 1.0, 0.5, -0.25;
  const Eigen::Vector2d b(2.0, 1.0);
  auto system = linear_system(a, b, Eigen::MatrixXd(0, 2));
  std::vector<double> y = {10.0, 0.0};
  const auto report = find(*system, y);
  ASSERT_TRUE(report.ok()) << report.failure().text();
  const Eigen::Vector2d exact = -a.inverse() * b;
  EXPECT_NEAR(y[0], exact(0), 1e-13 * exact(0));
  EXPECT_NEAR(y[1], exact(1), 1e-13 * exact(1));
  EXPECT_EQ(report.value().newton_steps, 2);
  EXPECT_LE(report.value().last_relative_step, 1e-11);
  EXPECT_LT(report.value().residual, 1e-12);
}

TEST(SteadyState, AHealthyChemostatSettlesOnItsBiomass) {
  auto system = chemostat(0.05, 0.4, 0.5, 10.0);
  std::vector<double> y = {10.0, 1e-3};
  const auto report = find(*system, y);
  ASSERT_TRUE(report.ok()) << report.failure().text();
  const double s = 0.5 * 0.05 / (0.4 - 0.05);
  EXPECT_NEAR(y[0], s, 1e-10 * s);
  EXPECT_NEAR(y[1], 10.0 - s, 1e-10);
}

// The seed is far below what the loose tolerance resolves of the whole, and takes off late.
TEST(SteadyState, ATinySeedTakesOffBeforeNewtonStarts) {
  auto system = chemostat(0.05, 0.06, 0.05, 10.0);  // net growth 0.0097 1/d
  std::vector<double> y = {10.0, 1e-5};
  const auto report = find(*system, y);
  ASSERT_TRUE(report.ok()) << report.failure().text();
  const double s = 0.05 * 0.05 / (0.06 - 0.05);
  EXPECT_NEAR(y[0], s, 1e-10 * s) << report.value().how;
  EXPECT_NEAR(y[1], 10.0 - s, 1e-10 * (10.0 - s));
}

TEST(SteadyState, AWashedOutGroupEndsAtZero) {
  auto system = chemostat(0.5, 0.4, 0.5, 10.0);
  std::vector<double> y = {0.2, 8.0};
  const auto report = find(*system, y);
  ASSERT_TRUE(report.ok()) << report.failure().text();
  EXPECT_NEAR(y[0], 10.0, 1e-10) << report.value().how;
  EXPECT_NEAR(y[1], 0.0, 1e-14) << report.value().how;
}

TEST(SteadyState, ASlowWashoutOverTenThousandDaysIsFollowed) {
  auto system = chemostat(0.3, 0.31489, 0.5, 10.0);  // net growth about -1e-4 1/d
  std::vector<double> y = {5.0, 5.0};
  const auto report = find(*system, y);
  ASSERT_TRUE(report.ok()) << report.failure().text();
  EXPECT_NEAR(y[0], 10.0, 1e-9) << report.value().how;
  EXPECT_NEAR(y[1], 0.0, 1e-12) << report.value().how;
}

TEST(SteadyState, ASlowModeOfTenThousandDaysIsReached) {
  Eigen::MatrixXd a(2, 2);
  a << -1e-4, 0.0, 1.0, -1.0;
  const Eigen::Vector2d b(3e-4, 0.0);
  auto system = linear_system(a, b, Eigen::MatrixXd(0, 2));
  std::vector<double> y = {0.0, 0.0};
  const auto report = find(*system, y);
  ASSERT_TRUE(report.ok()) << report.failure().text();
  EXPECT_NEAR(y[0], 3.0, 1e-11) << report.value().how;
  EXPECT_NEAR(y[1], 3.0, 1e-11);
}

/// Two stable states at 0 and 3, an unstable one at 1: x' = -x (x - 1) (x - 3).
std::unique_ptr<FunctionSystem> two_basins() {
  return std::make_unique<FunctionSystem>(
      1,
      [](std::span<const double> y, std::span<double> f) {
        f[0] = -y[0] * (y[0] - 1.0) * (y[0] - 3.0);
      },
      [](std::span<const double> y, Eigen::MatrixXd& j) {
        j(0, 0) = -3.0 * y[0] * y[0] + 8.0 * y[0] - 3.0;
      });
}

TEST(SteadyState, EachSideOfAnUnstableStateEndsInItsOwnBasin) {
  for (const double start : {0.9, 0.99, 0.9995}) {
    std::vector<double> y = {start};
    auto system = two_basins();
    const auto report = find(*system, y);
    ASSERT_TRUE(report.ok()) << report.failure().text();
    EXPECT_NEAR(y[0], 0.0, 1e-14) << start << ": " << report.value().how;
  }
  for (const double start : {1.0005, 1.01, 1.1, 30.0}) {
    std::vector<double> y = {start};
    auto system = two_basins();
    const auto report = find(*system, y);
    ASSERT_TRUE(report.ok()) << report.failure().text();
    EXPECT_NEAR(y[0], 3.0, 1e-12) << start << ": " << report.value().how;
  }
}

/// The same line with a second unknown that decays to it: (x, w) -> w' = -0.3 (w - x). The path
/// comes in from far along w and then lingers beside the unstable state x = 1.
TEST(SteadyState, APathThatLingersBesideAnUnstableStateIsFollowedOn) {
  for (const double start : {0.98, 0.9998, 1.0002, 1.02}) {
    FunctionSystem system(
        2,
        [](std::span<const double> y, std::span<double> f) {
          f[0] = -0.02 * y[0] * (y[0] - 1.0) * (y[0] - 3.0);
          f[1] = -0.3 * (y[1] - y[0]);
        },
        [](std::span<const double> y, Eigen::MatrixXd& j) {
          j << 0.02 * (-3.0 * y[0] * y[0] + 8.0 * y[0] - 3.0), 0.0, 0.3, -0.3;
        });
    std::vector<double> y = {start, 40.0};
    const auto report = find(system, y);
    ASSERT_TRUE(report.ok()) << report.failure().text();
    const double expected = start < 1.0 ? 0.0 : 3.0;
    EXPECT_NEAR(y[0], expected, 1e-11) << start << ": " << report.value().how;
    EXPECT_NEAR(y[1], expected, 1e-11) << start << ": " << report.value().how;
  }
}

TEST(SteadyState, AnEndlessOscillationIsReportedWithItsUnknown) {
  // the van der Pol oscillator keeps up its cycle
  FunctionSystem cycle(
      2,
      [](std::span<const double> y, std::span<double> f) {
        f[0] = y[1];
        f[1] = (1.0 - y[0] * y[0]) * y[1] - y[0];
      },
      [](std::span<const double> y, Eigen::MatrixXd& j) {
        j << 0.0, 1.0, -2.0 * y[0] * y[1] - 1.0, 1.0 - y[0] * y[0];
      });
  std::vector<double> y = {2.0, 0.0};
  const auto report =
      find(cycle, y, {.relative_step = 1e-11, .longest_time = 300.0, .progress = {}});
  ASSERT_FALSE(report.ok());
  EXPECT_THAT(report.failure().text(), HasSubstr("no steady state within 300 d"));
  EXPECT_THAT(report.failure().text(), HasSubstr("zone 0"));
}

TEST(SteadyState, AStartThatIsNotFiniteIsNamed) {
  auto system = chemostat(0.05, 0.4, 0.5, 10.0);
  std::vector<double> y = {10.0, std::nan("")};
  const auto report = find(*system, y);
  ASSERT_FALSE(report.ok());
  EXPECT_EQ(report.failure().quantity, "biomass");
  EXPECT_EQ(report.failure().place, "zone 0");
}

}  // namespace
}  // namespace stillzone::core
