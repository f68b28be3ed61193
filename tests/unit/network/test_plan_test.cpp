#include "network/tracer/test_plan.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace stillzone::network {
namespace {

/// A exp(-k t) with constant error: two samples at t = 0 and t = 1/k. Source: Box and Lucas (1959),
/// Biometrika 46:77-90.
TEST(OptimalDesign, AnExponentialDecayIsSampledAtZeroAndAtItsTimeConstant) {
  const double k = 0.25;
  std::vector<double> times;
  std::vector<double> rows;
  for (int i = 0; i <= 400; ++i) {
    const double t = 0.05 * i;
    times.push_back(t);
    rows.push_back(std::exp(-k * t));
    rows.push_back(-7.0 * t * std::exp(-k * t));
  }
  const auto chosen = optimal_design({rows}, {2}, times, {}, 2, 0.01);
  ASSERT_EQ(chosen.size(), 2U);
  EXPECT_NEAR(times[chosen[0]], 0.0, 1e-12);
  EXPECT_NEAR(times[chosen[1]], 1.0 / k, 0.05 + 1e-12);  // the grid
}

TEST(OptimalDesign, KeepsWhatIsKeptAndTheGap) {
  std::vector<double> times;
  std::vector<double> rows;
  for (int i = 0; i <= 100; ++i) {
    times.push_back(0.1 * i);
    rows.push_back(std::exp(-0.1 * i));
  }
  const auto chosen = optimal_design({rows}, {1}, times, {70}, 4, 0.5);
  EXPECT_NE(std::ranges::find(chosen, 70U), chosen.end());
  for (std::size_t i = 1; i < chosen.size(); ++i) {
    EXPECT_GE(times[chosen[i]] - times[chosen[i - 1]], 0.5 - 1e-9);
  }
}

PlanRequest request() {
  PlanRequest plan;
  plan.test.volume = core::Volume(3000.0);
  plan.test.mean_flow = core::FlowRate(150.0);
  plan.test.dose = PulseDose{.mass = 0.0, .duration = 1.0};
  plan.test.dose_into = "feed";
  plan.test.recovery_fitted = true;
  plan.test.points.emplace_back();
  plan.test.points[0].at = "outlet";
  plan.test.points[0].error_relative = 0.03;
  plan.test.points[0].detection_limit = 0.05;
  plan.draws = 20;
  return plan;
}

TEST(TestPlan, DoseGivesTheWantedPeakInTheNominalVolume) {
  PlanRequest wanted = request();
  wanted.peak = 4.0;
  const TestPlan plan = plan_test(wanted);
  EXPECT_NEAR(plan.mass, 4.0 * 3000.0, 1e-9);
  EXPECT_NEAR(plan.peak, 4.0 / 0.8, 1e-9);  // 20 % suspected dead
}

TEST(TestPlan, ExpectedErrorOfAMixedTanksVolumeIsThatOfItsInformation) {
  // With the dose trusted one parameter is left: 1/SE^2 = sum (dC/dV / sigma)^2 at the times.
  PlanRequest wanted = request();
  wanted.test.recovery_fitted = false;
  wanted.test.dose = PulseDose{.mass = 24000.0, .duration = 0.0};
  wanted.test.points[0].error_relative = 0.0;
  wanted.test.points[0].error_absolute = 0.1;
  wanted.suspect.dead_fraction = 0.2;
  const TestPlan plan = plan_test(wanted);
  double information = 0.0;
  for (const double t : plan.times) {
    const double v = 2400.0;
    const double c = 24000.0 / v * std::exp(-150.0 * t / v);
    if (c < 0.05) continue;
    const double slope = c / v * (150.0 * t / v - 1.0);
    information += slope * slope / 0.01;
  }
  EXPECT_NEAR(plan.models[0].standard_errors[0], 1.0 / std::sqrt(information),
              1e-9 / std::sqrt(information));
}

TEST(TestPlan, SameNumbersForAnyNumberOfThreads) {
  PlanRequest wanted = request();
  wanted.threads = 1;
  const TestPlan one = plan_test(wanted);
  wanted.threads = 2;
  const TestPlan two = plan_test(wanted);
  EXPECT_EQ(one.times, two.times);
  for (std::size_t i = 0; i < one.detection.size(); ++i) {
    EXPECT_EQ(one.detection[i].power, two.detection[i].power);
  }
}

}  // namespace
}  // namespace stillzone::network
