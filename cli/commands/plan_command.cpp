#include "cli/commands/plan_command.hpp"

#include <fstream>
#include <sstream>
#include <utility>

#include "cli/output_path.hpp"
#include "cli/plan_words.hpp"
#include "cli/report/plan_report.hpp"
#include "core/output_folder.hpp"
#include "core/units.hpp"
#include "network/tracer/plan_reader.hpp"

namespace stillzone::cli {
namespace {

int fail(const core::Failure& failure, const CommandLine& line, Console& console) {
  console.err << line.input << ": " << failure.text() << "\n";
  return kWrongInput;
}

int plan(const CommandLine& line, Console& console) {
  core::FaultList faults;
  const core::UnitReader units;
  auto document = core::JsonDocument::read(line.input, faults);
  if (document) {
    for (const std::string& setting : line.settings) document->set(setting, faults);
  }
  std::optional<network::PlanRequest> request;
  if (document && faults.empty()) request = network::read_plan_request(*document, units, faults);
  if (!faults.empty() || !request) {
    console.err << faults.text();
    return kWrongInput;
  }
  request->threads = line.threads;
  auto folder = core::OutputFolder::create(output_path(line));
  if (!folder) return fail(folder.failure(), line, console);
  const network::TestPlan made = network::plan_test(*request);
  std::ifstream file(line.input, std::ios::binary);
  std::ostringstream text;
  text << file.rdbuf();
  const std::string summary = plan_summary(*request, made).dump(2) + "\n";
  auto done = folder.value().write("summary.json", summary);
  if (done) done = folder.value().write("sampling.csv", sampling_sheet(made));
  if (done) {
    done = folder.value().write(
        "report.html", plan_report_page({.request = *request,
                                         .plan = made,
                                         .provenance = {.version = STILLZONE_VERSION,
                                                        .input_name = line.input,
                                                        .input_text = std::move(text).str(),
                                                        .command_line = line.whole,
                                                        .date = time_of_writing()}}));
  }
  if (done) done = folder.value().commit();
  if (!done) return fail(done.failure(), line, console);
  if (line.json) {
    console.out << summary;
    return kDone;
  }
  console.out << plan_tables(*request, made) << "\nWritten to " << output_path(line).string()
              << ": summary.json, sampling.csv, report.html\n";
  return kDone;
}

}  // namespace

Command plan_command() {
  return {.name = "plan",
          .summary = "designs a tracer test: dose, sampling times, what it would detect",
          .input_name = "TEST",
          .input_meaning = "test file with a \"plan\" block",
          .input_needed = true,
          .example = "stillzone plan cases/plan_lithium_test.json",
          .writes_output = true,
          .reads_case = true,
          .run = plan};
}

}  // namespace stillzone::cli
