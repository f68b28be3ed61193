// Writes report pages of invented results for the browser test:
//   report_sample_pages FOLDER
// three.html (the shipped three-zone case), two.html, thirty.html (networks of 2 and 30 zones) and
// long.html (200 days of 10 zones, recorded every 15 minutes); tracer.html (two regions, variable
// flow, tail under the detection limit) and step.html (a step test).
#include <fmt/format.h>

#include <cmath>
#include <fstream>
#include <iostream>
#include <optional>
#include <string>

#include "cli/report/run_report.hpp"
#include "core/units.hpp"
#include "tests/unit/cli/tracer_sample_support.hpp"

namespace {

using namespace stillzone;

/// A row of zones, with pockets that exchange with every second of them, one almost cut off.
std::string row_case(int n_row, int n_pockets) {
  std::string zones;
  std::string flows = R"({"from":"sludge","to":"cell 1","share":0.9})";
  const auto zone = [&](const std::string& name, double volume, const char* dome) {
    zones += fmt::format(R"({}"{}":{{"volume":"{} m3","gas":{{"to":"{}","kLa":"200 1/d"}}}})",
                         zones.empty() ? "" : ",", name, volume, dome);
  };
  for (int i = 1; i <= n_row; ++i) {
    zone(fmt::format("cell {}", i), 100.0 + 10.0 * i, i % 2 == 0 ? "dome" : "second dome");
    if (i < n_row) flows += fmt::format(R"(,{{"from":"cell {}","to":"cell {}"}})", i, i + 1);
  }
  for (int i = 1; i <= n_pockets; ++i) {
    zone(fmt::format("pocket {}", i), 60.0 + 5.0 * i, "dome");
    flows += fmt::format(R"(,{{"between":["cell {}","pocket {}"],"flow":"{} m3/d"}})",
                         (2 * i - 2) % n_row + 1, i, i == 1 ? 0.05 : 4.0 * i);
  }
  flows += fmt::format(R"(,{{"from":"sludge","to":"cell {0}"}},{{"from":"cell {0}","to":"weir"}})",
                       n_row);
  const std::string dome =
      R"({"volume":"30 m3","pipe":{"coefficient":"5e4 m3/d/bar","back_pressure":"1.013 bar","opening_pressure":"0 bar"}})";
  return fmt::format(
      R"({{"stillzone":"case/1","title":"{} cells <in> a row & {} pockets","kinetics":"adm1",)"
      R"("temperature":"35 degC","zones":{{{}}},"headspaces":{{"dome":{},"second dome":{}}},)"
      R"("feeds":{{"sludge":{{"flow":"170 m3/d","state":{{"X_ch":5.0}}}}}},"outlets":["weir"],)"
      R"("flows":[{}],"run":{{"kind":"steady"}}}})",
      n_row, n_pockets, zones, dome, dome, flows);
}

network::PlaceState water(const kinetics::KineticModel& model, const std::string& name, int z) {
  network::PlaceState place;
  place.place = name;
  for (const auto& c : model.components) place.state.push_back({c.name, c.unit, 0.1 + 0.01 * z});
  for (const auto& i : model.implicits) place.state.push_back({i.name, i.unit, 7.4 - 0.02 * z});
  for (const auto& d : model.derived) place.derived.push_back({d.name, d.unit, 0.3 + 0.1 * z});
  return place;
}

/// Waves with a noise of their own, so that no curve is easy to write short.
void add_column(network::Series& series, const std::string& place, const std::string& quantity,
                const std::string& unit, double middle, double swing, int z) {
  network::Series::Column column{place, quantity, unit, {}};
  unsigned noise = 12345U + static_cast<unsigned>(z);
  for (const double t : series.time) {
    noise = noise * 1664525U + 1013904223U;
    column.values.push_back(middle + swing * std::sin(0.3 * t + z) +
                            0.3 * swing * static_cast<double>(noise >> 8U) / (1U << 24U));
  }
  series.columns.push_back(std::move(column));
}

network::RunResult invented_result(const network::Case& the_case, int n_times, double days) {
  network::RunResult result;
  result.kind = n_times > 0 ? "dynamic" : "steady";
  result.until = days;
  const auto& model = the_case.kinetics;
  for (int i = 0; i < n_times; ++i) result.series.time.push_back(days * i / (n_times - 1));
  int z = 0;
  for (const auto& zone : the_case.zones) {
    result.zones.push_back(water(model, zone.name, z));
    add_column(result.series, zone.name, model.vfa, "kg COD/m3", 0.5 + 0.1 * z, 0.2, z);
    add_column(result.series, zone.name, "pH", "", 7.4 - 0.02 * z, 0.02, z);
    ++z;
  }
  for (const auto& outlet : the_case.outlets) {
    result.outlets.push_back({outlet.name, 170.0, water(model, outlet.name, 1)});
    add_column(result.series, outlet.name, "flow", "m3/d", 170.0, 20.0, 3);
  }
  for (const auto& headspace : the_case.headspaces) {
    network::HeadspaceResult gas;
    gas.name = headspace.name;
    gas.pressure = 1.07;
    gas.gas_flow_normal_dry = 2500.0;
    gas.methane_flow_normal = 1600.0;
    gas.mean_methane_flow_normal = 1590.0;
    gas.mean_gas_flow_normal_dry = 2480.0;
    gas.mean_gas_flow = 2900.0;
    gas.methane_share_dry = 0.64;
    result.headspaces.push_back(gas);
    add_column(result.series, headspace.name, "methane_flow_normal", "m3/d", 1600.0, 200.0, 1);
    add_column(result.series, headspace.name, "pressure", "bar", 1.07, 0.01, 2);
  }
  result.balances = {{"water", "m3", 170.0, 170.0, 0.0, 0.0, 0.0, 1e-15}};
  result.warnings = {"an invented warning with <tags> & signs"};
  return result;
}

bool write(const std::string& path, std::optional<core::JsonDocument> document,
           core::FaultList& faults, int n_times, double days) {
  const core::UnitReader units;
  auto the_case = document ? network::read_case(*document, units, faults) : std::nullopt;
  auto balance =
      the_case ? network::FlowBalance::solve(*the_case, *document, faults) : std::nullopt;
  if (!balance) {
    std::cerr << faults.text();
    return false;
  }
  const auto result = invented_result(*the_case, n_times, days);
  std::ofstream(path) << cli::run_report_page(
      {*the_case, *balance, result, {"test", "invented.json", "{}", "none", "no date"}});
  return true;
}

bool write_tracer(const std::string& path, const std::unique_ptr<cli::TracerSampleCase>& sample) {
  if (!sample) return false;
  std::ofstream(path) << cli::tracer_report_page(sample->input());
  return true;
}

}  // namespace

int main(int argc, char** argv) {
  if (argc != 2) return 2;
  const std::string folder = std::string(argv[1]) + "/";
  core::FaultList faults;
  const auto row = [&](const char* name, int n_row, int n_pockets, int n_times, double days) {
    const std::string path = folder + name + ".json";
    std::ofstream(path) << row_case(n_row, n_pockets);
    return write(folder + name + ".html", core::JsonDocument::read(path, faults), faults, n_times,
                 days);
  };
  const std::string three = std::string(STILLZONE_SOURCE_DIR) + "/cases/three_zone_example.json";
  const bool done =
      write(folder + "three.html", core::JsonDocument::read(three, faults), faults, 240, 60.0) &&
      row("two", 1, 1, 0, 0.0) && row("thirty", 20, 10, 0, 0.0) &&
      row("long", 7, 3, 19201, 200.0) &&
      write_tracer(folder + "tracer.html", cli::two_region_sample({})) &&
      write_tracer(folder + "step.html", cli::step_sample());
  return done ? 0 : 1;
}
