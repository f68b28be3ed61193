#pragma once

#include <map>
#include <optional>
#include <string>

#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

struct TracerReading {
  std::optional<TracerTest> test;
  std::string faults;  ///< the folder of the files taken out of paths
};

/// Reads a test whose tables are given as texts, through files in a folder of their own.
TracerReading read_test(const std::string& json, const std::map<std::string, std::string>& tables);

/// A test of 3000 m3 at 150 m3/d, 24 kg at 0 d, one sampling point in outlet.csv with columns t
/// [d] and c [g/m3], error 0.1 g/m3. `changes` replaces or adds top-level members, a JSON object;
/// `point` members of the sampling point. A member that is null is taken out.
std::string test_json(const std::string& changes = "{}", const std::string& point = "{}");

/// The usual test with this outlet.csv.
TracerReading read_outlet(const std::string& table, const std::string& changes = "{}",
                          const std::string& point = "{}");

}  // namespace stillzone::network
