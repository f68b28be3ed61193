#include "cli/commands/washout_command.hpp"

#include <fmt/format.h>

#include <ctime>
#include <filesystem>
#include <utility>

#include "cli/loaded_case.hpp"
#include "cli/progress.hpp"
#include "cli/report/washout_report.hpp"
#include "cli/run_log.hpp"
#include "cli/washout_summary.hpp"
#include "cli/washout_tables.hpp"
#include "core/output_folder.hpp"
#include "network/washout/washout_analysis.hpp"

namespace stillzone::cli {
namespace {

std::filesystem::path output_path(const CommandLine& line) {
  if (line.out) return *line.out;
  return std::filesystem::path(line.input).stem().string() + ".out";
}

std::string today() {
  const std::time_t now = std::time(nullptr);
  std::tm calendar{};
  gmtime_r(&now, &calendar);
  return fmt::format("{:04}-{:02}-{:02} {:02}:{:02} UTC", calendar.tm_year + 1900,
                     calendar.tm_mon + 1, calendar.tm_mday, calendar.tm_hour, calendar.tm_min);
}

core::Result<core::Done> write_files(const CommandLine& line, const LoadedCase& loaded,
                                     const network::Washout& washout, const std::string& summary,
                                     core::OutputFolder& folder) {
  auto done = folder.write("summary.json", summary);
  if (done) done = folder.write("curve.csv", washout_curve_csv(loaded.the_case, washout));
  if (done) {
    const WashoutReportInput input{.the_case = loaded.the_case,
                                   .balance = loaded.balance,
                                   .washout = washout,
                                   .provenance = {.version = STILLZONE_VERSION,
                                                  .input_name = line.input,
                                                  .input_text = loaded.text,
                                                  .command_line = line.whole,
                                                  .date = today()}};
    done = folder.write("report.html", washout_report_page(input));
  }
  if (done) done = folder.commit();
  return done;
}

int fail(const core::Failure& failure, const CommandLine& line, Console& console, int code) {
  console.err << line.input << ": " << failure.text() << "\n";
  return code;
}

int run_washout(const CommandLine& line, Console& console) {
  const auto log = make_log(line, console);
  const auto loaded = load_case(line, console);
  if (!loaded) return kWrongInput;
  auto folder = core::OutputFolder::create(output_path(line));
  if (!folder) return fail(folder.failure(), line, console, kWrongInput);
  auto washout = [&] {
    Progress progress(console);
    return network::analyse_washout(loaded->the_case, loaded->balance, {},
                                    [&](double share, double load) { progress.show(share, load); });
  }();
  if (!washout) return fail(washout.failure(), line, console, kNoSolution);
  const std::string summary = washout_summary(loaded->the_case, washout.value()).dump(2) + "\n";
  const auto written = write_files(line, *loaded, washout.value(), summary, folder.value());
  if (!written) return fail(written.failure(), line, console, kWrongInput);
  if (line.json) {
    console.out << summary;
    return kDone;
  }
  console.out << washout_tables(loaded->the_case, washout.value()) << "\nWritten to "
              << output_path(line).string() << ": summary.json, curve.csv, report.html\n";
  return kDone;
}

}  // namespace

Command washout_command() {
  return {.name = "washout",
          .summary = "washout margins and load curve, the network beside the ideal tank",
          .input_name = "CASE",
          .input_meaning = "case file",
          .input_needed = true,
          .example = "stillzone washout cases/short_circuit_stagnant.json",
          .writes_output = true,
          .reads_case = true,
          .run = run_washout};
}

}  // namespace stillzone::cli
