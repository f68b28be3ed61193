#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "tests/unit/network/tracer_reading_support.hpp"

namespace stillzone::network {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;
using testing::IsEmpty;

std::vector<double> values(const TracerReading& reading) {
  std::vector<double> all;
  for (const TracerSample& sample : reading.test->points.at(0).samples) all.push_back(sample.value);
  return all;
}
std::vector<double> times(const TracerReading& reading) {
  std::vector<double> all;
  for (const TracerSample& sample : reading.test->points.at(0).samples) all.push_back(sample.time);
  return all;
}
const std::vector<std::string>& notes(const TracerReading& reading) {
  return reading.test->points.at(0).notes;
}

TEST(TracerTestReader, ReadsAPlainTest) {
  const auto reading = read_outlet("t,c\n0,0\n1,7.6\n2,7.2\n", R"({"title": "Spring"})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_EQ(reading.test->title, "Spring");
  EXPECT_DOUBLE_EQ(reading.test->volume.value(), 3000.0);
  EXPECT_DOUBLE_EQ(reading.test->mean_flow.value(), 150.0);
  EXPECT_DOUBLE_EQ(std::get<PulseDose>(reading.test->dose).mass, 24000.0);
  EXPECT_EQ(reading.test->dose_into, "feed");
  EXPECT_EQ(reading.test->background.how, "none stated, taken as 0");
  EXPECT_EQ(reading.test->models.size(), 8U);
  EXPECT_THAT(values(reading), ElementsAre(0.0, 7.6, 7.2));
  EXPECT_THAT(notes(reading), IsEmpty());
  EXPECT_EQ(reading.test->points[0].samples[1].line, 3);
}

TEST(TracerTestReader, MissingCellsAreLeftOutAndCounted) {
  const auto reading = read_outlet("t,c\n0,0\n1,\n,5\n2,NA\n3,nan\n4,-\n5,#N/A\n6,7\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(times(reading), ElementsAre(0.0, 6.0));
  EXPECT_THAT(notes(reading),
              ElementsAre("outlet.csv: 6 of 8 rows have no time or no value; left out"));
}

TEST(TracerTestReader, DuplicatesAreAveragedWithTheirErrorOverRootN) {
  const auto reading = read_outlet("t,c\n0,0\n1,7\n1,8\n1,9\n2,7\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(values(reading), ElementsAre(0.0, 8.0, 7.0));
  EXPECT_NEAR(reading.test->points[0].samples[1].error, 0.1 / std::sqrt(3.0), 1e-15);
  EXPECT_DOUBLE_EQ(reading.test->points[0].samples[2].error, 0.1);
  EXPECT_THAT(notes(reading),
              ElementsAre("outlet.csv: lines 3, 4 and 5 have the same time; averaged"));
}

TEST(TracerTestReader, UnequalErrorsOfDuplicatesAddAsSquares) {
  const auto reading = read_outlet("t,c\n1,6\n1,8\n2,7\n", "{}", R"({"error": "10 %"})");
  ASSERT_TRUE(reading.test) << reading.faults;
  // sqrt(0.6^2 + 0.8^2) / 2
  EXPECT_NEAR(reading.test->points[0].samples[0].error, 0.5, 1e-15);
}

TEST(TracerTestReader, ANumberBesideALimitIsKeptAndOfTwoLimitsTheLower) {
  const auto reading = read_outlet("t,c\n1,<0.2\n1,0.4\n1,0.6\n2,<0.5\n2,<0.3\n3,7\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  const auto& samples = reading.test->points[0].samples;
  EXPECT_THAT(values(reading), ElementsAre(0.5, 0.3, 7.0));
  EXPECT_FALSE(samples[0].censored);
  EXPECT_NEAR(samples[0].error, 0.1 / std::sqrt(2.0), 1e-15);
  EXPECT_TRUE(samples[1].censored);
}

TEST(TracerTestReader, ManyDuplicatesMakeFewNotes) {
  std::string table = "t,c\n";
  for (int i = 0; i < 40; ++i) table += std::to_string(i / 2) + ",5\n";
  const auto reading = read_outlet(table);
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_EQ(notes(reading).size(), 5U);
  EXPECT_EQ(notes(reading).back(), "outlet.csv: 16 more times stand more than once; averaged");
}

TEST(TracerTestReader, UnsortedRowsAreSorted) {
  const auto reading = read_outlet("t,c\n2,7\n0,0\n1,8\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(values(reading), ElementsAre(0.0, 8.0, 7.0));
  EXPECT_THAT(notes(reading), ElementsAre("outlet.csv: rows were not in time order; sorted"));
}

TEST(TracerTestReader, CellsUnderALimitAreCensoredAtIt) {
  const auto reading = read_outlet("t,c\n1,<0.02\n2,< 0.03\n3,\"<0,04\"\n4,<=0.05\n5,0.06\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(values(reading), ElementsAre(0.02, 0.03, 0.04, 0.05, 0.06));
  for (std::size_t i = 0; i < 4; ++i) EXPECT_TRUE(reading.test->points[0].samples[i].censored);
  EXPECT_FALSE(reading.test->points[0].samples[4].censored);
}

TEST(TracerTestReader, ValuesUnderTheDetectionLimitAreCensored) {
  const auto reading =
      read_outlet("t,c\n1,0\n2,0.019\n3,0.02\n4,-0.01\n5,<0.5\n6,nd\n7,<LOD\n8,n.d.\n", "{}",
                  R"({"detection_limit": "0.02 g/m3"})");
  ASSERT_TRUE(reading.test) << reading.faults;
  const auto& samples = reading.test->points[0].samples;
  EXPECT_THAT(values(reading), ElementsAre(0.02, 0.02, 0.02, 0.02, 0.5, 0.02, 0.02, 0.02));
  std::vector<bool> censored;
  for (const TracerSample& sample : samples) censored.push_back(sample.censored);
  EXPECT_THAT(censored, ElementsAre(true, true, false, true, true, true, true, true));
}

TEST(TracerTestReader, NotDetectedWithoutALimitIsAFault) {
  EXPECT_EQ(read_outlet("t,c\n1,7\n2,ND\n").faults,
            "outlet.csv column c (line 3): \"ND\"; a sample under the limit needs the limit. Add "
            "\"detection_limit\", or write the cell like <0.02.\n");
}

TEST(TracerTestReader, DecimalCommasSemicolonsTabsAndByteOrderMark) {
  for (const char* table : {"\xEF\xBB\xBFt;c\r\n0,5;7,25\r\n1,5;<0,02\r\n",
                            "\xEF\xBB\xBFt\tc\n0,5\t7,25\n1,5\t<0,02\n"}) {
    const auto reading = read_outlet(table);
    ASSERT_TRUE(reading.test) << reading.faults;
    EXPECT_THAT(times(reading), ElementsAre(0.5, 1.5));
    EXPECT_THAT(values(reading), ElementsAre(7.25, 0.02));
    EXPECT_TRUE(reading.test->points[0].samples[1].censored);
  }
}

TEST(TracerTestReader, UnitsOfTheColumns) {
  const auto reading = read_outlet("t,c\n12,7000\n24,<20\n", "{}",
                                   R"({"time": {"unit": "h"}, "value": {"unit": "ug/L"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(times(reading), ElementsAre(0.5, 1.0));
  EXPECT_NEAR(values(reading)[0], 7.0, 1e-14);
  EXPECT_NEAR(values(reading)[1], 0.02, 1e-16);
  const auto mg_l = read_outlet("t,c\n1,7\n", "{}", R"({"value": {"unit": "mg/L"}})");
  ASSERT_TRUE(mg_l.test) << mg_l.faults;
  EXPECT_DOUBLE_EQ(values(mg_l)[0], 7.0);
}

TEST(TracerTestReader, ErrorAsShareAsConcentrationAndBoth) {
  const auto error_of = [](const char* written, double value) {
    const auto reading = read_outlet("t,c\n1," + std::to_string(value) + "\n2,10\n", "{}",
                                     std::string(R"({"error": )") + written + "}");
    EXPECT_TRUE(reading.test) << reading.faults;
    return reading.test ? reading.test->points[0].samples[0].error : -1.0;
  };
  EXPECT_NEAR(error_of(R"("3 %")", 8.0), 0.24, 1e-15);
  EXPECT_NEAR(error_of(R"("0.1 mg/L")", 8.0), 0.1, 1e-15);
  EXPECT_NEAR(error_of(R"(["3 %", "0.1 g/m3"])", 8.0), 0.26, 1e-15);
  EXPECT_NEAR(error_of(R"(["0.1 g/m3", "3 %"])", -8.0), 0.1, 1e-15);
}

TEST(TracerTestReader, AShareAloneIsTakenOfAFloorForSmallValues) {
  const auto with_limit = read_outlet("t,c\n1,<0.02\n2,10\n", "{}",
                                      R"({"error": "3 %", "detection_limit": "0.05 g/m3"})");
  ASSERT_TRUE(with_limit.test) << with_limit.faults;
  EXPECT_NEAR(with_limit.test->points[0].samples[0].error, 0.03 * 0.05, 1e-15);
  const auto without = read_outlet("t,c\n1,0\n2,10\n3,-1\n", "{}", R"({"error": "3 %"})");
  ASSERT_TRUE(without.test) << without.faults;
  EXPECT_NEAR(without.test->points[0].samples[0].error, 0.03 * 0.1, 1e-15);
  EXPECT_NEAR(without.test->points[0].samples[2].error, 0.03 * 0.1, 1e-15);
  EXPECT_THAT(notes(without)[0], HasSubstr("for 2 small values it is taken of 1 % of the largest"));
}

TEST(TracerTestReader, NegativeValuesAreKeptAndTold) {
  const auto reading = read_outlet("t,c\n1,-0.05\n2,8\n3,-0.5\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(values(reading), ElementsAre(-0.05, 8.0, -0.5));
  EXPECT_THAT(notes(reading),
              ElementsAre("outlet.csv: 2 values below zero, kept as measured; 1 by more than three "
                          "errors: check the blank"));
}

TEST(TracerTestReader, SamplesBeforeTheDoseAreSetApart) {
  const auto reading =
      read_outlet("t,c\n-2,0.03\n-1,0.01\n0,0.02\n1,8\n", R"({"background": "before dose"})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(times(reading), ElementsAre(0.0, 1.0));
  EXPECT_EQ(reading.test->points[0].before.size(), 2U);
  EXPECT_DOUBLE_EQ(reading.test->background.level, 0.02);
  EXPECT_EQ(reading.test->background.how, "mean of 2 samples before the dose");
}

TEST(TracerTestReader, ADoseLaterThanTheFirstSamples) {
  const auto reading = read_outlet("t,c\n0,<0.04\n1,0.02\n2,0.02\n3,8\n",
                                   R"({"background": "before dose", "dose": {"at": "1.5 d"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(times(reading), ElementsAre(2.0, 3.0));
  EXPECT_DOUBLE_EQ(reading.test->dose_at, 1.5);
  EXPECT_EQ(
      reading.test->background.how,
      "mean of 2 samples before the dose, 1 of them under the limit and counted at half of it");
  EXPECT_DOUBLE_EQ(reading.test->background.level, 0.02);
}

TEST(TracerTestReader, ADriftBeforeTheDoseIsToldButNotFollowed) {
  const auto reading =
      read_outlet("t,c\n-4,1\n-3,1.2\n-2,1.4\n-1,1.6\n1,8\n", R"({"background": "before dose"})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_DOUBLE_EQ(reading.test->background.level, 1.3);
  EXPECT_DOUBLE_EQ(reading.test->background.slope, 0.0);
  ASSERT_EQ(reading.test->notes.size(), 1U);
  EXPECT_THAT(reading.test->notes[0], HasSubstr("the samples before the dose drift"));
  const auto steady =
      read_outlet("t,c\n-4,1.1\n-3,1\n-2,1.1\n-1,1\n1,8\n", R"({"background": "before dose"})");
  EXPECT_THAT(steady.test->notes, IsEmpty());
}

TEST(TracerTestReader, ADriftingBackgroundAsStated) {
  const auto reading = read_outlet(
      "t,c\n1,8\n",
      R"({"background": {"at_dose": "0.02 g/m3", "later": "50 ug/L", "after": "60 d"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_DOUBLE_EQ(reading.test->background.level, 0.02);
  EXPECT_NEAR(reading.test->background.slope, 0.0005, 1e-15);
}

TEST(TracerTestReader, DatesCountFromTheDose) {
  const auto reading = read_outlet(
      "t,c\n01.03.2026 08:00,0.02\n02.03.2026 08:00,0\n02.03.2026 20:00,8\n03.03.2026,7\n",
      R"({"dose": {"at": "2026-03-02 08:00"}})",
      R"({"time": {"unit": null, "dates": "day first"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_DOUBLE_EQ(reading.test->dose_at, 0.0);
  ASSERT_EQ(times(reading).size(), 3U);
  EXPECT_NEAR(times(reading)[1], 0.5, 1e-9);
  EXPECT_NEAR(times(reading)[2], 2.0 / 3.0, 1e-9);
  EXPECT_NEAR(reading.test->points[0].before[0].time, -1.0, 1e-9);
}

TEST(TracerTestReader, TheTimeOfDayMayStandInAColumnOfItsOwn) {
  const char* const point =
      R"({"time": {"column": "day", "clock": "hour", "unit": null, "dates": "month first"}})";
  const char* const dose = R"({"dose": {"at": "2026-03-02 08:00"}})";
  const auto reading =
      read_outlet("day,hour,c\n3/2/2026,8:00 PM,8\n3/3/2026,,9\n3/4/2026,08:00,6\n", dose, point);
  ASSERT_TRUE(reading.test) << reading.faults;
  ASSERT_EQ(times(reading).size(), 2U);
  EXPECT_NEAR(times(reading)[0], 0.5, 1e-9);
  EXPECT_NEAR(times(reading)[1], 2.0, 1e-9);
  EXPECT_THAT(read_outlet("day,hour,c\n3/2/2026,8.00,8\n", dose, point).faults,
              HasSubstr("outlet.csv column day (line 2): \"3/2/2026 8.00\"; a date and time"));
  EXPECT_THAT(read_outlet("t,c\n1,8\n", "{}", R"({"time": {"clock": "c"}})").faults,
              HasSubstr("a time of day belongs to a column of dates"));
}

TEST(TracerTestReader, ElapsedTimesBesideADatedDoseCountFromIt) {
  const auto reading = read_outlet("t,c\n1,8\n", R"({"dose": {"at": "2026-03-02 08:00"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(times(reading), ElementsAre(1.0));
  EXPECT_THAT(notes(reading),
              ElementsAre("outlet.csv: its elapsed times are counted from the dose"));
}

TEST(TracerTestReader, SpreadsheetDayNumbersGetAClearMessage) {
  const auto dates =
      read_outlet("t,c\n46083.25,8\n46083.5,7\n", R"({"dose": {"at": "2026-03-02 08:00"}})",
                  R"({"time": {"unit": null, "dates": "year first"}})");
  EXPECT_THAT(dates.faults,
              HasSubstr("outlet.csv column t (line 2): \"46083.25\"; a date and time belongs here, "
                        "\"year first\". This is a spreadsheet's day number (it stands for "
                        "2026-03-02 06:00): give the column the format yyyy-mm-dd hh:mm and export "
                        "it again.\n"));
  EXPECT_EQ(read_outlet("t,c\n46083.25,8\n46083.5,7\n").faults,
            "outlet.csv column t (line 2): 46083.2 d as the first time; this looks like a "
            "spreadsheet's day number (for 2026-03-02 06:00). Give the column the format "
            "yyyy-mm-dd hh:mm, export it again and write \"dates\": \"year first\" in place of "
            "\"unit\".\n");
}

TEST(TracerTestReader, AStepDose) {
  const auto reading = read_outlet("t,c\n1,0.1\n2,0.3\n",
                                   R"({"dose": {"mass": null, "step": "3 mg/L", "at": "12 h"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_DOUBLE_EQ(std::get<StepDose>(reading.test->dose).concentration, 3.0);
  EXPECT_DOUBLE_EQ(reading.test->dose_at, 0.5);
}

TEST(TracerTestReader, ATimedDose) {
  const auto reading = read_outlet("t,c\n1,8\n", R"({"dose": {"over": "6 h"}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_DOUBLE_EQ(std::get<PulseDose>(reading.test->dose).duration, 0.25);
  EXPECT_THAT(reading.test->notes, IsEmpty());
  EXPECT_THAT(read_outlet("t,c\n1,8\n", R"({"dose": {"over": "2 d"}})").test->notes,
              ElementsAre("the dose took 2 d and was still running at the last sample"));
}

TEST(TracerTestReader, SeveralSamplingPoints) {
  const std::string point =
      R"("time": {"column": "t", "unit": "d"}, "value": {"column": "c", "unit": "g/m3"},
         "error": "5 %")";
  const auto reading =
      read_test(test_json(R"({"models": [{"case": "mine.json"}], "samples": [
        {"at": "outlet", "csv": "a.csv", )" +
                          point + R"(}, {"at": "floor", "csv": "b.csv", )" + point + "}]}"),
                {{"a.csv", "t,c\n1,8\n2,7\n"}, {"b.csv", "t,c\n1,0.5\n"}});
  ASSERT_TRUE(reading.test) << reading.faults;
  ASSERT_EQ(reading.test->points.size(), 2U);
  EXPECT_EQ(reading.test->points[1].at, "floor");
  EXPECT_THAT(reading.test->models, IsEmpty());
  EXPECT_THAT(reading.test->model_cases, ElementsAre("mine.json"));
}

TEST(TracerTestReader, UnreadableCellsAreFaultsAndOnlyAFewAreShown) {
  EXPECT_EQ(
      read_outlet("t;c\n1,5;3,4,5\n2;inf\n").faults,
      "outlet.csv column c (line 2): \"3,4,5\"; a number belongs here, or nothing where it is "
      "missing. Put units and remarks into the header or another column.\n"
      "outlet.csv column c (line 3): \"inf\"; a number belongs here, or nothing where it is "
      "missing. Put units and remarks into the header or another column.\n");
  EXPECT_THAT(read_outlet("t,c\n1,>50\n").faults, HasSubstr("over the range of the instrument"));
  EXPECT_THAT(read_outlet("t,c\n1,<abc\n").faults, HasSubstr("written like <0.02"));
  EXPECT_THAT(read_outlet("t,c\n1,<0.02x\n").faults, HasSubstr("written like <0.02"));
  EXPECT_THAT(read_outlet("t,c\n1,<-1\n").faults, HasSubstr("written like <0.02"));
  std::string wrong = "t,c\n";
  for (int i = 0; i < 100; ++i) wrong += "1,sunny\n";
  EXPECT_THAT(read_outlet(wrong).faults, HasSubstr("outlet.csv: 97 more cells like these"));
}

TEST(TracerTestReader, AllSamplesCensoredIsAReadableTest) {
  const auto reading = read_outlet("t,c\n1,<0.02\n2,<0.02\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_EQ(reading.test->points[0].samples.size(), 2U);
}

TEST(TracerTestReader, OneSampleIsAReadableTest) { EXPECT_TRUE(read_outlet("t,c\n1,8\n").test); }

constexpr const char* kRecord =
    R"({"flow": {"csv": "flow.csv", "time": {"column": "day", "unit": "d"},
                 "value": {"column": "q", "unit": "m3/d"}}})";

TracerReading read_with_record(const std::string& record, const std::string& samples,
                               const char* changes = kRecord) {
  return read_test(test_json(changes), {{"outlet.csv", samples}, {"flow.csv", record}});
}

TEST(TracerTestReader, AFlowRecordGivesTheMeanFlowOfTheTest) {
  const auto reading =
      read_with_record("day,q\n-5,999\n0,100\n10,0\n15,200\n20,900\n", "t,c\n1,8\n20,1\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  // (10 d x 100 + 5 d x 0 + 5 d x 200 m3/d) / 20 d
  EXPECT_NEAR(reading.test->mean_flow.value(), 100.0, 1e-12);
  EXPECT_THAT(reading.test->notes, IsEmpty());
}

TEST(TracerTestReader, MendsOfAFlowRecordAreTold) {
  const auto reading = read_with_record("day,q\n8,150\n2,100\n4,\n6,NA\n", "t,c\n1,8\n20,1\n");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_THAT(
      reading.test->notes,
      ElementsAre("flow.csv: 2 of 4 rows have no time or no flow; the row before holds on in their "
                  "place",
                  "flow.csv: rows were not in time order; sorted",
                  "flow.csv: the record starts 2 d after the dose; its first flow is taken before "
                  "that too",
                  "the last row of the flow record is 12 d before the last sample; its flow of 150 "
                  "m3/d is taken until then"));
}

TEST(TracerTestReader, AFlowRecordWithDates) {
  const auto reading =
      read_with_record("day,q\n3/1/2026,100\n3/3/2026 8:00 AM,200\n", "t,c\n1,8\n2,1\n",
                       R"({"dose": {"at": "2026-03-02 08:00"},
          "flow": {"csv": "flow.csv", "time": {"column": "day", "dates": "month first"},
                   "value": {"column": "q", "unit": "m3/d"}}})");
  ASSERT_TRUE(reading.test) << reading.faults;
  EXPECT_NEAR(reading.test->mean_flow.value(), 150.0, 1e-6);
}

TEST(TracerTestReader, BadFlowRecordsAreFaults) {
  EXPECT_THAT(read_with_record("day,q\n0,100\n1,-5\n", "t,c\n1,8\n").faults,
              HasSubstr("flow.csv column q (line 3): \"-5\"; the flow through the tank is >= 0. "));
  EXPECT_THAT(read_with_record("day,q\n0,100\n0,50\n", "t,c\n1,8\n").faults,
              HasSubstr("flow.csv (line 3): the time of line 2 again"));
  EXPECT_THAT(read_with_record("day,q\n0,0\n30,50\n", "t,c\n1,8\n").faults,
              HasSubstr("test.json /flow (line 4): a record of no flow from the dose to the last "
                        "sample"));
  EXPECT_THAT(read_with_record("day,q\n0,NA\n", "t,c\n1,8\n").faults,
              HasSubstr("no row has both a time and a flow"));
  EXPECT_THAT(
      read_with_record("day,q\n46083.5,100\n46084,50\n", "t,c\n1,8\n").faults,
      HasSubstr("flow.csv column day (line 2): 46083.5 d as the first time; this looks like "
                "a spreadsheet's day number"));
}

TEST(TracerTestReader, TwoWaysToWriteTimesAreRefused) {
  EXPECT_THAT(read_outlet("t,c\n1,8\n", "{}", R"({"time": {"dates": "day first"}})").faults,
              HasSubstr("\"unit\" and \"dates\"; times are elapsed or dates, not both"));
  EXPECT_THAT(read_outlet("t,c\n1,8\n", "{}", R"({"time": {"unit": null}})").faults,
              HasSubstr("neither \"unit\" nor \"dates\""));
}

TEST(TracerTestReader, AWrongDoseTimeDoesNotDragOtherFaultsAlong) {
  EXPECT_EQ(read_outlet("t,c\n2026-03-03,8\n", R"({"dose": {"at": "02.03.2026 08:00"}})",
                        R"({"time": {"unit": null, "dates": "year first"}})")
                .faults,
            "test.json /dose/at (line 8): \"02.03.2026 08:00\"; the date of a dose is written year "
            "first. Write it like \"2026-03-02 08:00\".\n");
}

TEST(TracerTestReader, EveryBrokenTestGetsItsExactMessages) {
  namespace fs = std::filesystem;
  const fs::path folder = fs::path(STILLZONE_SOURCE_DIR) / "tests/program/broken/tests";
  const core::UnitReader units;
  int n_files = 0;
  for (const auto& entry : fs::directory_iterator(folder)) {
    fs::path file = entry.path();
    if (file.extension() != ".json") continue;
    ++n_files;
    core::FaultList faults;
    const auto text_of = [](const fs::path& path) {
      std::ostringstream text;
      text << std::ifstream(path, std::ios::binary).rdbuf();
      return text.str();
    };
    const auto document =
        core::JsonDocument::parse(text_of(file), file.filename().string(), folder, faults);
    if (document) {
      EXPECT_FALSE(read_tracer_test(*document, units, faults)) << file;
    }
    std::string found = faults.text();
    const std::string prefix = folder.string() + "/";
    for (auto at = found.find(prefix); at != std::string::npos; at = found.find(prefix, at)) {
      found.erase(at, prefix.size());
    }
    EXPECT_EQ(found, text_of(file.replace_extension(".expected"))) << file;
  }
  EXPECT_GE(n_files, 34);
}

}  // namespace
}  // namespace stillzone::network
