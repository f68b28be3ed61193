#pragma once

#include <gtest/gtest.h>

#include <filesystem>
#include <nlohmann/json.hpp>
#include <optional>
#include <string>

#include "core/units.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::testing {

/// Reads a tracer test from JSON; its CSV files lie in `folder`. Faults fail the test.
inline std::optional<network::TracerTest> read_test(const nlohmann::json& json,
                                                    const std::filesystem::path& folder) {
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(json.dump(), "test.json", folder, faults);
  std::optional<network::TracerTest> test;
  if (document) test = network::read_tracer_test(*document, core::UnitReader(), faults);
  EXPECT_TRUE(faults.empty()) << faults.text();
  return test;
}

}  // namespace stillzone::testing
