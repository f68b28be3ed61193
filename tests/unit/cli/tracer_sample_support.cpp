#include "tests/unit/cli/tracer_sample_support.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <array>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <iostream>

#include "core/units.hpp"
#include "network/tracer/dose_response.hpp"
#include "network/tracer/network_model.hpp"

namespace stillzone::cli {

namespace {

namespace fs = std::filesystem;

/// About normal, mean 0, deviation 1, from a seed alone: twelve even numbers.
class Noise {
 public:
  double next() {
    double sum = -6.0;
    for (int i = 0; i < 12; ++i) {
      state_ = state_ * 1664525U + 1013904223U;
      sum += static_cast<double>(state_ >> 8U) / (1U << 24U);
    }
    return sum;
  }

 private:
  unsigned state_ = 20260U;
};

/// Reads the document with its tables in a folder of its own; nullptr and the faults when it
/// cannot.
std::unique_ptr<TracerSampleCase> read(const std::string& text, const std::string& outlet,
                                       const std::string& flow,
                                       const std::string& still = "t,li\n") {
  const fs::path folder = fs::temp_directory_path() /
                          fmt::format("stillzone_tracer_sample_{}_{}", ::getpid(), outlet.size());
  fs::create_directories(folder);
  std::ofstream(folder / "outlet.csv") << outlet;
  std::ofstream(folder / "flow.csv") << flow;
  std::ofstream(folder / "still.csv") << still;
  core::FaultList faults;
  std::optional<network::TracerTest> test;
  if (const auto document = core::JsonDocument::parse(text, "test.json", folder, faults)) {
    const core::UnitReader units;
    test = network::read_tracer_test(*document, units, faults);
  }
  fs::remove_all(folder);
  if (!test) {
    std::cerr << faults.text();
    return nullptr;
  }
  auto sample = std::make_unique<TracerSampleCase>();
  sample->text = text;
  sample->test = std::move(*test);
  return sample;
}

void analyse(TracerSampleCase& sample,
             std::vector<std::shared_ptr<const network::TracerModel>> networks = {}) {
  sample.analysis = network::analyse_tracer_test(sample.test, std::move(networks), {});
  sample.remarks = {"An invented remark of the command with <tags> & signs."};
}

std::string pulse_test(const std::string& models) {
  return fmt::format(
      R"({{
  "stillzone": "test/1",
  "title": "Lithium test, invented, two <regions> & a tail",
  "volume": "3000 m3",
  "flow": {{ "csv": "flow.csv", "time": {{ "column": "day", "unit": "d" }}, "value": {{ "column": "q", "unit": "m3/d" }} }},
  "dose": {{ "tracer": "lithium", "mass": "24 kg", "at": "0 d", "over": "30 min" }},
  "background": "before dose",
  "samples": [ {{ "at": "outlet", "csv": "outlet.csv", "time": {{ "column": "t", "unit": "d" }},
    "value": {{ "column": "li", "unit": "g/m3" }}, "error": [ "0.1 g/m3", "2 %" ], "detection_limit": "0.3 g/m3" }} ],
  "recovery": "fitted"{}
}}
)",
      models.empty() ? "" : ",\n  \"models\": " + models);
}

/// Flow of a day, m3/d.
double flow_of(int day) {
  return 150.0 + 40.0 * std::sin(0.7 * day) + (day % 7 == 6 ? -60.0 : 0.0);
}

std::string flow_record() {
  std::string csv = "day,q\n";
  for (int day = -5; day <= 90; ++day) csv += fmt::format("{},{:.1f}\n", day, flow_of(day));
  return csv;
}

}  // namespace

std::unique_ptr<TracerSampleCase> two_region_sample(const std::string& models) {
  // Read once with any samples for the clock and the dose, then with those made by the model.
  const std::string before = "t,li\n-3,0.20\n-2,0.24\n-1,0.17\n-0.2,0.22\n";
  const std::string text = pulse_test(models);
  const auto blank = read(text, before + "1,5\n2,5\n3,5\n4,5\n5,5\n", flow_record());
  if (!blank) return nullptr;
  const auto model = network::make_candidate("stagnant_exchange", blank->test);
  const std::vector<double> truth = {0.65, 45.0};
  std::string outlet = before;
  Noise noise;
  for (int i = 1; i <= 40; ++i) {
    const double t = 85.0 * std::pow(i / 40.0, 2.2);
    const network::SamplePosition position{0, blank->test.turnovers(t)};
    double value = 0.0;
    if (!model->predict(truth, {&position, 1}, {&value, 1}, {})) return nullptr;
    const double reading = 0.2 + 0.92 * value * (1.0 + 0.02 * noise.next()) + 0.1 * noise.next();
    outlet += reading < 0.3 ? fmt::format("{:.3f},<0.3\n", t)
                            : fmt::format("{:.3f},{:.2f}\n", t, reading);
    if (i == 12) outlet += fmt::format("{:.3f},{:.2f}\n", t, reading + 0.05);
    if (i == 20) outlet += fmt::format("{:.3f},\n", t + 0.1);
  }
  auto sample = read(text, outlet, flow_record());
  if (sample) analyse(*sample);
  return sample;
}

std::unique_ptr<TracerSampleCase> own_network_sample() {
  const std::string text = R"({
  "stillzone": "test/1", "title": "Two sampling points, invented", "volume": "1000 m3",
  "flow": "50 m3/d", "dose": { "tracer": "lithium", "mass": "10 kg", "at": "0 d", "over": "1 h" },
  "background": "0 g/m3", "recovery": "as dosed", "models": [{ "case": "one_tank.json" }],
  "samples": [
    { "at": "outlet", "csv": "outlet.csv", "time": { "column": "t", "unit": "d" },
      "value": { "column": "li", "unit": "g/m3" }, "error": "0.1 g/m3" },
    { "at": "pocket", "csv": "still.csv", "time": { "column": "t", "unit": "d" },
      "value": { "column": "li", "unit": "g/m3" }, "error": "0.1 g/m3" } ]
})";
  const std::string network = R"({
  "stillzone": "case/1", "title": "core and pocket", "kinetics": "inert", "temperature": "35 degC",
  "zones": { "core": { "volume": { "value": "700 m3", "fit": ["100 m3", "2000 m3"] } },
             "pocket": { "volume": { "value": "300 m3", "fit": ["10 m3", "2000 m3"] } } },
  "feeds": { "in": { "flow": "50 m3/d", "state": {} } }, "outlets": ["outlet"],
  "flows": [ { "from": "in", "to": "core" }, { "from": "core", "to": "outlet" },
             { "between": ["core", "pocket"], "flow": { "value": "20 m3/d", "fit": ["0.1 m3/d", "500 m3/d"] } } ],
  "run": { "kind": "steady" }
})";
  core::FaultList faults;
  const core::UnitReader units;
  // A network of the user's own may bear the name of one of our models.
  const auto document = core::JsonDocument::parse(network, "one_tank.json", ".", faults);
  const std::string blank_table = "t,li\n1,5\n2,5\n3,5\n4,5\n5,5\n";
  const auto blank = read(text, blank_table, "", blank_table);
  if (!document || !blank) return nullptr;
  auto user = network::bind_user_network(*document, "own_network.json", blank->test, units, faults);
  if (!user) {
    std::cerr << faults.text();
    return nullptr;
  }
  std::vector<double> truth;
  for (const auto& parameter : user->model->parameters()) truth.push_back(parameter.start);
  std::array<std::string, 2> tables = {"t,li\n", "t,li\n"};
  Noise noise;
  for (int i = 1; i <= 30; ++i) {
    const double t = 70.0 * std::pow(i / 30.0, 1.8);
    for (std::size_t point = 0; point < 2; ++point) {
      const network::SamplePosition position{point, blank->test.turnovers(t)};
      double value = 0.0;
      if (!user->model->predict(truth, {&position, 1}, {&value, 1}, {})) return nullptr;
      tables[point] += fmt::format("{:.3f},{:.2f}\n", t, value + 0.1 * noise.next());
    }
  }
  auto sample = read(text, tables[0], "", tables[1]);
  if (sample)
    analyse(*sample, {std::shared_ptr<const network::TracerModel>(std::move(user->model))});
  return sample;
}

std::unique_ptr<TracerSampleCase> too_few_samples() {
  auto sample = read(pulse_test(""), "t,li\n-1,0.2\n1,6\n5,4.5\n9,3\n", flow_record());
  if (sample) analyse(*sample);
  return sample;
}

std::unique_ptr<TracerSampleCase> step_sample() {
  const std::string text = R"({
  "stillzone": "test/1", "title": "Step test, invented", "volume": "800 m3", "flow": "100 m3/d",
  "dose": { "tracer": "fluoride", "step": "5 g/m3", "at": "0 d" }, "background": "0 g/m3",
  "samples": [ { "at": "outlet", "csv": "outlet.csv", "time": { "column": "t", "unit": "d" },
    "value": { "column": "f", "unit": "g/m3" }, "error": "0.05 g/m3" } ],
  "recovery": "as dosed", "models": ["one_tank", "bypass_dead", "dispersion"]
})";
  std::string outlet = "t,f\n";
  Noise noise;
  for (int i = 1; i <= 25; ++i) {
    outlet += fmt::format("{},{:.3f}\n", 1.6 * i,
                          5.0 * (1.0 - std::exp(-1.6 * i / 8.0)) + 0.05 * noise.next());
  }
  auto sample = read(text, outlet, "");
  if (sample) analyse(*sample);
  return sample;
}

}  // namespace stillzone::cli
