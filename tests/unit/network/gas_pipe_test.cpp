#include "network/gas_pipe.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace stillzone::network {
namespace {

GasPipe pipe(double opening) {
  return {core::GasConductance(5e4), core::Pressure(1.013), core::Pressure(opening)};
}

TEST(GasPipe, IsShutBelowItsOpeningPressure) {
  for (const double pressure : {0.0, 0.5, 1.0, 1.013, 1.0629, 1.06299}) {
    const PipeFlow flow = pipe_flow(pipe(0.05), pressure);
    EXPECT_EQ(flow.flow, 0.0) << pressure;
    EXPECT_EQ(flow.by_pressure, 0.0) << pressure;
  }
}

TEST(GasPipe, NeverFlowsBackwardAndNeverFallsWithPressure) {
  double before = 0.0;
  for (int k = -1000; k <= 3000; ++k) {
    const PipeFlow flow = pipe_flow(pipe(0.0), 1.013 + k * 1e-8);
    EXPECT_GE(flow.flow, before);
    EXPECT_GE(flow.by_pressure, 0.0);
    before = flow.flow;
  }
}

TEST(GasPipe, IsLinearInTheOverpressureAboveTheBlend) {
  // Rosen and Jeppsson (2006): q = k_p (P - P_atm).
  EXPECT_DOUBLE_EQ(pipe_flow(pipe(0.0), 1.063).flow, 5e4 * (1.063 - 1.013));
  EXPECT_DOUBLE_EQ(pipe_flow(pipe(0.02), 1.063).flow, 5e4 * (1.063 - 1.013 - 0.02));
  EXPECT_DOUBLE_EQ(pipe_flow(pipe(0.0), 1.063).by_pressure, 5e4);
}

TEST(GasPipe, ACheckValveNeedsItsOverpressureToOpen) {  // common practice, no source
  EXPECT_EQ(pipe_flow(pipe(0.02), 1.032).flow, 0.0);
  EXPECT_GT(pipe_flow(pipe(0.02), 1.034).flow, 0.0);
}

TEST(GasPipe, SlopeIsTheDerivativeOfTheFlowAndHasNoJump) {
  constexpr double kWidth = 1e-2;
  const double step = 1e-7;
  for (const double over : {-1e-3, 1e-4, 2e-3, 5e-3, 8e-3, 9.9e-3, 1.1e-2}) {
    const double p = 1.013 + over;
    const double slope = (pipe_flow(pipe(0.0), p + step, kWidth).flow -
                          pipe_flow(pipe(0.0), p - step, kWidth).flow) /
                         (2.0 * step);
    EXPECT_NEAR(pipe_flow(pipe(0.0), p, kWidth).by_pressure, slope, 1e-4 * 5e4) << over;
  }
  // Value, slope and curvature meet at both ends: close to an end the slope differs from the end's
  // by the square of the distance only.
  for (const double distance : {1e-3, 1e-4}) {
    const double s = distance;  // of the width
    const double at_start = pipe_flow(pipe(0.0), 1.013 + s * kWidth, kWidth).by_pressure / 5e4;
    const double at_end =
        1.0 - pipe_flow(pipe(0.0), 1.013 + (1.0 - s) * kWidth, kWidth).by_pressure / 5e4;
    EXPECT_LT(std::abs(at_start), 20.0 * s * s);
    EXPECT_LT(std::abs(at_end), 20.0 * s * s);
  }
}

}  // namespace
}  // namespace stillzone::network
