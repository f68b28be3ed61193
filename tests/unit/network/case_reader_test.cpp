#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>

#include "network/case.hpp"
#include "tests/unit/network/network_support.hpp"

namespace stillzone::network {
namespace {

struct Reading {
  std::optional<Case> the_case;
  std::string faults;
};

/// Reads a case file of the source folder and closes its flow balance, as `check` does.
Reading read(const std::string& path) {
  core::FaultList faults;
  const std::filesystem::path file(path);
  const auto document = core::JsonDocument::parse(
      file_text(path), file.filename().string(),
      std::filesystem::path(STILLZONE_SOURCE_DIR) / file.parent_path(), faults);
  Reading reading;
  if (document) {
    const core::UnitReader units;
    reading.the_case = read_case(*document, units, faults);
    if (reading.the_case && !FlowBalance::solve(*reading.the_case, *document, faults)) {
      reading.the_case.reset();
    }
  }
  reading.faults = faults.text();
  return reading;
}

std::vector<std::string> files_in(const std::string& folder) {
  std::vector<std::string> files;
  for (const auto& entry :
       std::filesystem::directory_iterator(std::filesystem::path(STILLZONE_SOURCE_DIR) / folder)) {
    if (entry.path().extension() == ".json") {
      files.push_back(folder + "/" + entry.path().filename().string());
    }
  }
  std::ranges::sort(files);
  return files;
}

TEST(CaseReader, EveryShippedCaseIsRightAndBalances) {
  std::size_t n_cases = 0;
  for (const std::string& file : files_in("cases")) {
    if (file_text(file).find("\"case/1\"") == std::string::npos) continue;  // a test or a study
    EXPECT_EQ(read(file).faults, "") << file;
    ++n_cases;
  }
  EXPECT_GE(n_cases, 6U);
}

TEST(CaseReader, EveryBrokenCaseGetsItsExactMessages) {
  const auto files = files_in("tests/program/broken/cases");
  EXPECT_GE(files.size(), 20U);
  for (const std::string& file : files) {
    const Reading reading = read(file);
    EXPECT_FALSE(reading.the_case) << file;
    std::string expected_file = file;
    expected_file.replace(file.rfind(".json"), 5, ".expected");
    EXPECT_EQ(reading.faults, file_text(expected_file)) << file;
  }
}

TEST(CaseReader, TheThreeZoneExampleIsReadInInternalUnits) {
  const Reading reading = read("cases/three_zone_example.json");
  ASSERT_TRUE(reading.the_case) << reading.faults;
  const Case& the_case = *reading.the_case;
  EXPECT_EQ(the_case.title, "Three-zone example");
  EXPECT_NEAR(the_case.temperature.value(), 308.15, 1e-12);
  ASSERT_EQ(the_case.zones.size(), 3U);
  EXPECT_NEAR(the_case.zones[1].volume.value(), 680.0, 1e-9);
  EXPECT_NEAR(the_case.zones[1].gas->coefficient.value(), 20.0, 1e-9);
  EXPECT_NEAR(the_case.headspaces[0].pipe.coefficient.value(), 5e4, 1e-6);
  EXPECT_NEAR(the_case.headspaces[0].pipe.back_pressure.value(), 1.013, 1e-12);
  const auto lipids = the_case.kinetics.component("X_li");
  ASSERT_TRUE(lipids);
  EXPECT_DOUBLE_EQ(the_case.feeds[0].state[*lipids].value, 5.0);
  EXPECT_NEAR(the_case.schedules[0].timeline.mean(0.0, 1.0), 0.24, 1e-12);
  EXPECT_EQ(the_case.run.kind, RunSettings::Kind::dynamic);
  EXPECT_EQ(the_case.run.start, RunSettings::Start::steady);
  EXPECT_NEAR(the_case.run.until.value(), 60.0, 1e-12);
  EXPECT_NEAR(the_case.run.record_every.value(), 0.25, 1e-12);
  EXPECT_TRUE(the_case.warnings.empty());
}

TEST(CaseReader, RecordsFollowTheirTable) {
  const Reading reading = read("cases/load_steps.json");
  ASSERT_TRUE(reading.the_case) << reading.faults;
  const Feed& feed = reading.the_case->feeds[0];
  ASSERT_TRUE(feed.flow.record && feed.load.record);
  EXPECT_DOUBLE_EQ(feed.flow.record->value_from(20.0), 130.0);
  EXPECT_DOUBLE_EQ(feed.load.record->value_from(13.0), 1.5);
}

TEST(CaseReader, AGivenStartHoldsWhatItNames) {
  const Reading reading = read("cases/tracer_pulse.json");
  ASSERT_TRUE(reading.the_case) << reading.faults;
  EXPECT_EQ(reading.the_case->run.start, RunSettings::Start::given);
  EXPECT_DOUBLE_EQ(reading.the_case->run.given_start.at("inlet").begin()->second, 1.0);
}

}  // namespace
}  // namespace stillzone::network
