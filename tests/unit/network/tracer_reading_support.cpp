#include "tests/unit/network/tracer_reading_support.hpp"

#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>

namespace stillzone::network {
namespace {

void replace_all(std::string& text, const std::string& from, const std::string& to) {
  for (auto at = text.find(from); at != std::string::npos; at = text.find(from, at)) {
    text.replace(at, from.size(), to);
    at += to.size();
  }
}

}  // namespace

TracerReading read_test(const std::string& json, const std::map<std::string, std::string>& tables) {
  namespace fs = std::filesystem;
  static int n_folders = 0;
  const fs::path folder =
      fs::temp_directory_path() /
      ("stillzone_tracer_" + std::to_string(::getpid()) + "_" + std::to_string(n_folders++));
  fs::create_directories(folder);
  for (const auto& [name, text] : tables) {
    std::ofstream(folder / name, std::ios::binary) << text;
  }
  core::FaultList faults;
  TracerReading reading;
  if (const auto document = core::JsonDocument::parse(json, "test.json", folder, faults)) {
    const core::UnitReader units;
    reading.test = read_tracer_test(*document, units, faults);
  }
  reading.faults = faults.text();
  replace_all(reading.faults, folder.string() + "/", "");
  fs::remove_all(folder);
  return reading;
}

std::string test_json(const std::string& changes, const std::string& point) {
  using Json = nlohmann::ordered_json;
  Json test = Json::parse(R"({
    "stillzone": "test/1",
    "volume": "3000 m3",
    "flow": "150 m3/d",
    "dose": { "tracer": "lithium", "mass": "24 kg", "at": "0 d" },
    "samples": [ { "at": "outlet", "csv": "outlet.csv", "time": { "column": "t", "unit": "d" },
                   "value": { "column": "c", "unit": "g/m3" }, "error": "0.1 g/m3" } ]
  })");
  test["samples"][0].merge_patch(Json::parse(point));
  test.merge_patch(Json::parse(changes));
  return test.dump(2);
}

TracerReading read_outlet(const std::string& table, const std::string& changes,
                          const std::string& point) {
  return read_test(test_json(changes, point), {{"outlet.csv", table}});
}

}  // namespace stillzone::network
