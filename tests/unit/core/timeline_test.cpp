#include "core/timeline.hpp"

#include <gtest/gtest.h>

namespace stillzone::core {
namespace {

TEST(Timeline, IsOnFromTheSwitchOnAndIdleFromTheSwitchOff) {
  const auto mixing =
      Timeline::switched(Timeline::Periodic{1.0 / 24, 12.0 / 1440, 0.0}, {}, {}, 0.05);
  EXPECT_DOUBLE_EQ(mixing.value_from(0.0), 1.0);
  EXPECT_DOUBLE_EQ(mixing.value_from(12.0 / 1440), 0.05);
  EXPECT_DOUBLE_EQ(mixing.value_from(1.0 / 24), 1.0);
  EXPECT_NEAR(mixing.mean(0.0, 1.0), 0.2 + 0.8 * 0.05, 1e-15);
  EXPECT_DOUBLE_EQ(mixing.period().value(), 1.0 / 24);
}

TEST(Timeline, SwitchesAreAllFoundAndValuesChangeExactlyThere) {
  // Feed 5 min a day and mixing 12 min an hour over 30 days: 2 * 30 + 2 * 720 = 1500 switches, less
  // those at time 0 and the last instants.
  const auto mixing =
      Timeline::switched(Timeline::Periodic{1.0 / 24, 12.0 / 1440, 0.0}, {}, {}, 0.0);
  double t = 0.0;
  double value = mixing.value_from(0.0);
  int n = 0;
  for (auto next = mixing.next_switch(t); next && *next < 30.0 - 1e-9;
       next = mixing.next_switch(t)) {
    ASSERT_GT(*next, t);
    EXPECT_NE(mixing.value_from(*next) > 0.5, value > 0.5) << n;
    EXPECT_EQ(mixing.value_from(std::nextafter(*next, 0.0)) > 0.5, value > 0.5) << n;
    t = *next;
    value = mixing.value_from(t);
    ++n;
  }
  EXPECT_EQ(n, 2 * 720 - 1);
}

TEST(Timeline, TenThousandPeriodsDoNotDrift) {
  const auto pulses = Timeline::switched(Timeline::Periodic{0.1, 0.03, 0.0}, {}, {}, 0.0);
  EXPECT_NEAR(pulses.next_switch(999.95).value(), 1000.0, 1e-12);
  double t = 0.0;
  for (int k = 0; k < 20000; ++k) {
    const double next = pulses.next_switch(t).value();
    ASSERT_GT(next, t);
    t = next;
  }
  EXPECT_NEAR(t, 1000.0, 1e-9);
}

TEST(Timeline, OffWindowsWinOverThePeriodAndOnWindows) {
  const auto outage =
      Timeline::switched(Timeline::Periodic{1.0, 0.5, 0.0}, {{9.0, 11.0}}, {{10.0, 15.0}}, 0.0);
  EXPECT_DOUBLE_EQ(outage.value_from(9.7), 1.0);
  EXPECT_DOUBLE_EQ(outage.value_from(10.2), 0.0);
  EXPECT_DOUBLE_EQ(outage.value_from(15.2), 1.0);
  EXPECT_FALSE(outage.period().has_value());
}

TEST(Timeline, StepsHoldUntilTheNextRow) {
  const auto record = Timeline::steps({1.0, 3.0}, {10.0, 20.0});
  EXPECT_DOUBLE_EQ(record.value_from(0.0), 10.0);
  EXPECT_DOUBLE_EQ(record.value_from(2.9), 10.0);
  EXPECT_DOUBLE_EQ(record.value_from(3.0), 20.0);
  EXPECT_DOUBLE_EQ(record.next_switch(0.0).value(), 3.0);
  EXPECT_FALSE(record.next_switch(3.0).has_value());
  EXPECT_NEAR(record.mean(1.0, 5.0), 15.0, 1e-14);
}

TEST(Timeline, AlwaysOnNeverSwitches) {
  const Timeline always;
  EXPECT_DOUBLE_EQ(always.value_from(5.0), 1.0);
  EXPECT_FALSE(always.next_switch(0.0).has_value());
  EXPECT_DOUBLE_EQ(always.period().value(), 0.0);
}

std::string schedule_faults(const char* text) {
  FaultList faults;
  const auto document = JsonDocument::parse(text, "case.json", ".", faults);
  const UnitReader units;
  std::vector<FreeQuantity> free_quantities;
  const ReadingContext context{*document, units, faults, free_quantities};
  ObjectReader reader(context, document->root(), "");
  EXPECT_FALSE(read_schedule(reader).has_value());
  return faults.text();
}

TEST(Schedule, FaultsNameTheWayOut) {
  EXPECT_EQ(schedule_faults(R"({"every": "1 h", "on_for": "2 h"})"),
            "case.json /on_for (line 1): 0.0833333 d on; \"on_for\" is at most \"every\" "
            "(0.0416667 d). Shorten \"on_for\", or leave the schedule out for something always "
            "on.\n");
  EXPECT_EQ(schedule_faults("{}"),
            "case.json (line 1): a schedule that never switches; a schedule repeats (\"every\", "
            "\"on_for\") or has windows (\"on\", \"off\"). Write for example {\"every\": \"1 h\", "
            "\"on_for\": \"12 min\"}.\n");
  EXPECT_EQ(schedule_faults(R"({"off": [["12 d", "10 d"]]})"),
            "case.json /off/0 (line 1): [\"12 d\", \"10 d\"]; a window ends after it begins. "
            "Swap the two.\n");
  EXPECT_EQ(schedule_faults(R"({"evry": "1 h", "on_for": "2 h"})"),
            "case.json (line 1): no \"every\"; \"every\" is needed: a duration, like \"1 d\". Add "
            "\"every\".\ncase.json /evry (line 1): key \"evry\"; this key is not known here. Did "
            "you mean \"every\"?\n");
}

}  // namespace
}  // namespace stillzone::core
