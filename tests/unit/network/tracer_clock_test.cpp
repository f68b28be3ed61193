#include <gtest/gtest.h>

#include <cmath>

#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {
namespace {

TracerTest steady() {
  TracerTest test;
  test.volume = core::Volume(3000.0);
  test.mean_flow = core::FlowRate(150.0);
  return test;
}

/// 100 m3/d to day 2, none to day 5, 250 m3/d to day 9, then 50 m3/d; the dose at day 1; 1000 m3.
TracerTest recorded() {
  TracerTest test;
  test.volume = core::Volume(1000.0);
  test.flow_record = core::Timeline::steps({0.0, 2.0, 5.0, 9.0}, {100.0, 0.0, 250.0, 50.0});
  test.mean_flow = core::FlowRate(100.0);
  test.dose_at = 1.0;
  return test;
}

TEST(TracerClock, TurnoversOfASteadyFlowAreTimeOverRetentionTime) {
  TracerTest test = steady();
  test.dose_at = 2.0;
  EXPECT_DOUBLE_EQ(test.turnovers(22.0), 1.0);
  EXPECT_DOUBLE_EQ(test.turnovers(0.0), -0.1);
  EXPECT_DOUBLE_EQ(test.time_at(1.0), 22.0);
  EXPECT_DOUBLE_EQ(test.time_at(-0.1), 0.0);
}

TEST(TracerClock, TurnoversOfARecordAreWaterPassedOverVolume) {
  const TracerTest test = recorded();
  // From the dose: 100 m3 to day 2, nothing to day 5, then 250 m3/d; by hand.
  EXPECT_DOUBLE_EQ(test.turnovers(1.0), 0.0);
  EXPECT_DOUBLE_EQ(test.turnovers(1.5), 0.05);
  EXPECT_DOUBLE_EQ(test.turnovers(2.0), 0.1);
  EXPECT_DOUBLE_EQ(test.turnovers(6.0), 0.35);
  EXPECT_DOUBLE_EQ(test.turnovers(9.0), 1.1);
  EXPECT_DOUBLE_EQ(test.turnovers(11.0), 1.2);
  EXPECT_DOUBLE_EQ(test.turnovers(0.0), -0.1);
  EXPECT_DOUBLE_EQ(test.turnovers(-3.0), -0.4);
}

TEST(TracerClock, TurnoversStandStillWhileNothingFlows) {
  const TracerTest test = recorded();
  for (const double t : {2.0, 2.5, 4.0, 5.0}) EXPECT_DOUBLE_EQ(test.turnovers(t), 0.1) << t;
}

TEST(TracerClock, TimeAtIsTheInverseOfTurnovers) {
  const TracerTest test = recorded();
  for (const double t : {-3.0, -0.5, 0.0, 0.7, 1.0, 1.3, 1.99, 5.01, 7.0, 8.9, 9.5, 40.0}) {
    EXPECT_NEAR(test.time_at(test.turnovers(t)), t, 1e-12) << t;
  }
}

TEST(TracerClock, TimeAtOfAStandstillIsItsStart) {
  const TracerTest test = recorded();
  EXPECT_DOUBLE_EQ(test.time_at(test.turnovers(4.0)), 2.0);
}

TEST(TracerClock, ARecordThatEndsDryNeverReachesMoreTurnovers) {
  TracerTest test = recorded();
  test.flow_record = core::Timeline::steps({0.0, 2.0}, {100.0, 0.0});
  EXPECT_DOUBLE_EQ(test.turnovers(1e6), 0.1);
  EXPECT_TRUE(std::isinf(test.time_at(0.2)));
  EXPECT_DOUBLE_EQ(test.time_at(0.1), 2.0);
}

TEST(TracerClock, AStandstillBeforeTheDoseIsLeftOutGoingBack) {
  TracerTest test = recorded();
  test.dose_at = 6.0;
  for (const double t : {-1.0, 0.5, 1.5, 5.5}) {
    EXPECT_NEAR(test.time_at(test.turnovers(t)), t, 1e-12) << t;
  }
}

}  // namespace
}  // namespace stillzone::network
