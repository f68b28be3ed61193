#include "cli/commands/run_command.hpp"

#include <fmt/format.h>
#include <spdlog/spdlog.h>

#include <filesystem>
#include <utility>

#include "cli/health_remarks.hpp"
#include "cli/loaded_case.hpp"
#include "cli/output_path.hpp"
#include "cli/progress.hpp"
#include "cli/report/run_report.hpp"
#include "cli/run_log.hpp"
#include "cli/run_tables.hpp"
#include "cli/series_csv.hpp"
#include "cli/series_netcdf.hpp"
#include "cli/summary_json.hpp"
#include "core/output_folder.hpp"
#include "network/simulation.hpp"

namespace stillzone::cli {
namespace {

core::Result<core::Done> write_files(const CommandLine& line, const LoadedCase& loaded,
                                     const network::RunResult& result, const std::string& summary,
                                     core::OutputFolder& folder) {
  auto done = folder.write("summary.json", summary);
  if (done && !result.series.time.empty()) {
    done = folder.write("series.csv", series_csv(result.series));
    if (done) {
      done = write_series_netcdf(folder.path("series.nc"), result, loaded.the_case.title,
                                 time_of_writing() + " " + line.whole);
    }
  }
  if (done) {
    const RunReportInput input{.the_case = loaded.the_case,
                               .balance = loaded.balance,
                               .result = result,
                               .provenance = {.version = STILLZONE_VERSION,
                                              .input_name = line.input,
                                              .input_text = loaded.text,
                                              .command_line = line.whole,
                                              .date = time_of_writing()}};
    done = folder.write("report.html", run_report_page(input));
  }
  if (done) done = folder.commit();
  return done;
}

int fail(const core::Failure& failure, const CommandLine& line, Console& console, int code) {
  console.err << line.input << ": " << failure.text() << "\n";
  return code;
}

int run_case(const CommandLine& line, Console& console) {
  const auto log = make_log(line, console);
  const auto loaded = load_case(line, console);
  if (!loaded) return kWrongInput;
  log->debug("{}: {} zones, {} flows, kinetics {}", line.input, loaded->the_case.zones.size(),
             loaded->the_case.flows.size(), loaded->the_case.kinetics.name);
  // The folder is opened before the computation: a wrong --out is told at once.
  auto folder = core::OutputFolder::create(output_path(line));
  if (!folder) return fail(folder.failure(), line, console, kWrongInput);
  network::RunHooks hooks;
  auto result = [&] {
    Progress progress(console);
    hooks.progress = [&](double share, double time_d) { progress.show(share, time_d); };
    return network::run_case(loaded->the_case, loaded->balance, hooks);
  }();
  if (!result) return fail(result.failure(), line, console, kNoSolution);
  for (std::string& remark : health_remarks(loaded->the_case, result.value())) {
    result.value().warnings.push_back(std::move(remark));
  }
  log->debug("{} steps, {} Jacobians, {:.3g} s; {}", result.value().solver.steps,
             result.value().solver.jacobian_calls, result.value().seconds,
             result.value().solution_note);
  const std::string summary = run_summary(result.value(), loaded->the_case.title).dump(2) + "\n";
  const auto written = write_files(line, *loaded, result.value(), summary, folder.value());
  if (!written) return fail(written.failure(), line, console, kWrongInput);
  if (line.json) {
    console.out << summary;
    return kDone;
  }
  const std::filesystem::path path = output_path(line);
  console.out << run_tables(loaded->the_case, result.value()) << "\nWritten to " << path.string()
              << ": summary.json, "
              << (result.value().series.time.empty() ? "" : "series.csv, series.nc, ")
              << "report.html\n";
  return kDone;
}

}  // namespace

Command run_command() {
  return {.name = "run",
          .summary = "integrates a case, or finds its steady or periodic state",
          .input_name = "CASE",
          .input_meaning = "case file",
          .input_needed = true,
          .example = "stillzone run cases/three_zone_example.json --set \"/run/until=120 d\"",
          .writes_output = true,
          .reads_case = true,
          .run = run_case};
}

}  // namespace stillzone::cli
