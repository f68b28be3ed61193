#include "core/timeline.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>

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

TEST(Schedule, WindowsInDisorderAndExtremesAreFaults) {
  EXPECT_EQ(schedule_faults(R"({"on": [["1 d", "3 d"], ["2 d", "4 d"]]})"),
            "case.json /on/1 (line 1): a window that begins at 2 d; the one before it ends at 3 d. "
            "Put windows in order, without overlap.\n");
  EXPECT_EQ(schedule_faults(R"({"on": [["1 d", "1 d"]]})"),
            "case.json /on/0 (line 1): [\"1 d\", \"1 d\"]; a window ends after it begins. Swap the "
            "two.\n");
  EXPECT_EQ(schedule_faults(R"({"on": ["1 d"]})"),
            "case.json /on/0 (line 1): \"1 d\"; a window is a list of two times. Write it like "
            "[\"10 d\", \"12 d\"].\n");
  EXPECT_EQ(schedule_faults(R"({"every": "1 h", "on_for": "0 s"})"),
            "case.json /on_for (line 1): \"0 s\"; a duration must be > 0 here.\n");
  EXPECT_EQ(schedule_faults(R"({"every": "1e-20 s", "on_for": "1e-20 s"})"),
            "case.json /on_for (line 1): 1e-20 s; a schedule is on for 1 s at least. Give the mean "
            "flow instead of the pulses.\n");
  EXPECT_EQ(schedule_faults(R"({"every": "1 h", "on_for": "1 min", "first_on": "1e30 d"})"),
            "case.json /first_on (line 1): 1e+30 d; \"first_on\" is within 1e+06 d of the start. "
            "Give the first switch after the start of the run.\n");
  EXPECT_EQ(schedule_faults(R"({"first_on": "1 h"})"),
            "case.json /first_on (line 1): \"first_on\" without \"every\"; a first switch belongs "
            "to a repeated one. Add \"every\" and \"on_for\".\n");
  EXPECT_EQ(schedule_faults(R"({"every": "1 h", "on_for": "1 min", "idle": 5})"),
            "case.json /idle (line 1): 5; \"idle\" is a factor from 0 to 1. Give the share of the "
            "flow that goes on while off.\n");
}

TEST(Timeline, FarTimesEndToo) {
  const auto pulses = Timeline::switched(Timeline::Periodic{1e-3, 5e-4, 0.3}, {}, {}, 0.0);
  for (const double t : {-1e300, -1e18, 1e18, 1e300}) (void)pulses.value_from(t);
}

TEST(Timeline, ValueAndNextSwitchAgreeForAwkwardPeriods) {
  for (const double every : {1.0 / 24.0, 0.1, 1.0 / 3.0, 1.0 / 7.0, 5.0 / 1440.0}) {
    for (const double share : {0.2, 1.0 / 3.0, 0.999}) {
      const double first = 0.037;
      const auto pulses =
          Timeline::switched(Timeline::Periodic{every, share * every, first}, {}, {}, 0.25);
      double t = first;
      for (int k = 0; k < 20000; ++k) {
        const bool on = k % 2 == 0;
        ASSERT_DOUBLE_EQ(pulses.value_from(t), on ? 1.0 : 0.25) << every << " " << k;
        const double next = pulses.next_switch(t).value();
        ASSERT_DOUBLE_EQ(pulses.value_from(0.5 * (t + next)), on ? 1.0 : 0.25);
        const double expected =
            on ? first + (k / 2) * every + share * every : first + (k / 2 + 1) * every;
        ASSERT_DOUBLE_EQ(next, expected);
        ASSERT_GT(next, t);
        t = next;
      }
    }
  }
}

/// A feed pulse of 5 min a day and 12 min of mixing an hour: each day's switch on is also an
/// hour's.
TEST(Timeline, FeedAndMixingOfAMonthSwitch1469TimesBesidesTheStart) {
  const auto mixing =
      Timeline::switched(Timeline::Periodic{1.0 / 24, 12.0 / 1440, 0.0}, {}, {}, 0.0);
  const auto feed = Timeline::switched(Timeline::Periodic{1.0, 5.0 / 1440, 0.0}, {}, {}, 0.0);
  int n = 0;
  double t = 0.0;
  while (true) {
    const double next = std::min(mixing.next_switch(t).value(), feed.next_switch(t).value());
    if (next > 30.0 - 1e-9) break;
    ASSERT_GT(next, t);
    n += next - t > 1e-9 ? 1 : 0;  // both at a day's start: k/24 and k' may differ by rounding
    t = next;
  }
  EXPECT_EQ(n, (2 * 720 - 1) + 30);  // mixing without its first; feed's switches off
}

std::optional<Timeline> record(const char* csv, const char* reading, std::string& faults_text) {
  // Tests run side by side: each has a folder of its own.
  const auto* test = testing::UnitTest::GetInstance()->current_test_info();
  const std::filesystem::path folder =
      std::filesystem::temp_directory_path() / (std::string("stillzone-record-") + test->name());
  std::filesystem::create_directories(folder);
  std::ofstream(folder / "flow.csv") << csv;
  FaultList faults;
  const auto document = JsonDocument::parse(reading, "case.json", folder, faults);
  const UnitReader units;
  std::vector<FreeQuantity> free_quantities;
  const ReadingContext context{*document, units, faults, free_quantities};
  ObjectReader reader(context, document->root(), "");
  auto timeline = read_record(reader, Measure::flow);
  faults_text = faults.text();
  const std::string place = folder.string() + "/";
  for (auto at = faults_text.find(place); at != std::string::npos; at = faults_text.find(place)) {
    faults_text.erase(at, place.size());
  }
  std::filesystem::remove_all(folder);
  return timeline;
}

constexpr const char* kFlowRecord =
    R"({"csv": "flow.csv", "time": {"column": "t", "unit": "h"}, "value": {"column": "q", "unit": "L/s"}})";

TEST(Record, IsSortedConvertedAndHeld) {
  std::string faults;
  const auto flow = record("t,q\n24,2\n0,1\n12,NA\n48,3\n", kFlowRecord, faults);
  ASSERT_TRUE(flow.has_value()) << faults;
  EXPECT_NEAR(flow->value_from(0.5), 86.4, 1e-12);
  EXPECT_NEAR(flow->value_from(1.0), 172.8, 1e-12);
  EXPECT_NEAR(flow->value_from(99.0), 259.2, 1e-12);
  EXPECT_DOUBLE_EQ(flow->next_switch(0.0).value(), 1.0);
}

TEST(Record, FaultsNameRowsColumnsAndUnits) {
  std::string faults;
  EXPECT_FALSE(record("t,q\n0,1\n1,2\n0,3\n", kFlowRecord, faults));
  EXPECT_EQ(faults,
            "flow.csv (line 4): the time of line 2 again; each time of a record stands once. Take "
            "one of the two rows out.\n");
  EXPECT_FALSE(record("t,q\n0,NA\n", kFlowRecord, faults));
  EXPECT_EQ(faults,
            "case.json /csv (line 1): \"flow.csv\"; no row has both a time and a value. Check the "
            "columns.\n");
  EXPECT_FALSE(record("time,q\n0,1\n",
                      R"({"csv": "flow.csv", "time": {"column": "tim", "unit": "h"},
        "value": {"column": "q", "unit": "m3"}})",
                      faults));
  EXPECT_EQ(faults,
            "case.json /time/column (line 1): \"tim\"; flow.csv has no such column. Did you mean "
            "\"time\"?\n"
            "case.json /value/unit (line 2): \"m3\"; \"m3\" measures a volume, and a flow is "
            "needed. Write one of m3/d, m3/h, L/s, gpm, MGD.\n");
}

}  // namespace
}  // namespace stillzone::core
