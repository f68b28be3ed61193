#include "cli/commands/tracer_command.hpp"

#include <fmt/format.h>
#include <spdlog/spdlog.h>

#include <charconv>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <utility>

#include "cli/output_path.hpp"
#include "cli/report/tracer_report.hpp"
#include "cli/run_log.hpp"
#include "cli/tracer_summary.hpp"
#include "cli/tracer_tables.hpp"
#include "core/near_name.hpp"
#include "core/output_folder.hpp"
#include "network/tracer/emitted_case.hpp"
#include "network/tracer/network_model.hpp"

namespace stillzone::cli {
namespace {

/// A test with the user networks it names.
struct LoadedTest {
  core::JsonDocument document;
  network::TracerTest test;
  std::vector<std::shared_ptr<const network::TracerModel>> networks;
  std::vector<std::string> warnings;
  std::string text;  ///< the file as it stands, for provenance
};

std::string text_of(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  std::ostringstream text;
  text << file.rdbuf();
  return std::move(text).str();
}

std::optional<LoadedTest> load_test(const CommandLine& line, Console& console) {
  core::FaultList faults;
  const core::UnitReader units;
  auto document = core::JsonDocument::read(line.input, faults);
  if (document) {
    for (const std::string& setting : line.settings) document->set(setting, faults);
  }
  std::optional<network::TracerTest> test;
  if (document && faults.empty()) test = network::read_tracer_test(*document, units, faults);
  std::vector<std::shared_ptr<const network::TracerModel>> networks;
  std::vector<std::string> warnings;
  for (std::size_t i = 0; test && i < test->model_cases.size(); ++i) {
    const std::string& path = test->model_cases[i];
    auto user = network::load_user_network(document->folder() / path, path, *test, units, faults);
    if (!user) continue;
    for (const std::string& remark : user->remarks) warnings.push_back(path + ": " + remark);
    networks.push_back(std::move(user->model));
  }
  if (!faults.empty() || !test) {
    console.err << faults.text();
    return std::nullopt;
  }
  for (const std::string& note : test->notes) warnings.push_back(note);
  for (const network::SamplingPoint& point : test->points) {
    warnings.insert(warnings.end(), point.notes.begin(), point.notes.end());
  }
  return LoadedTest{.document = std::move(*document),
                    .test = std::move(*test),
                    .networks = std::move(networks),
                    .warnings = std::move(warnings),
                    .text = text_of(line.input)};
}

/// Reads --feed FILE: {"NAME": {"flow": .., ..}}, or a case with one feed.
std::optional<network::EmittedFeed> load_feed(const std::string& path, Console& console) {
  core::FaultList faults;
  const auto document = core::JsonDocument::read(path, faults);
  if (!document) {
    console.err << faults.text();
    return std::nullopt;
  }
  const core::Json& root = document->root();
  const core::Json& feeds = root.is_object() && root.contains("feeds") ? root["feeds"] : root;
  if (!feeds.is_object() || feeds.size() != 1 || !feeds.begin()->is_object()) {
    console.err << fmt::format(
        "{}: {} feeds; an emitted case takes one. Write {{\"sludge\": {{\"flow\": \"150 m3/d\", "
        "\"state\": {{..}}}}}}, or name a case with one feed.\n",
        path, feeds.is_object() ? feeds.size() : 0);
    return std::nullopt;
  }
  return network::EmittedFeed{.name = feeds.begin().key(), .block = feeds.begin().value()};
}

/// The model that --emit means: a number in the ranking or a name; nullptr after a complaint.
const network::RankedModel* chosen_model(const std::string& wanted,
                                         const network::TracerAnalysis& analysis,
                                         Console& console) {
  std::size_t number = 0;
  const auto [end, error] = std::from_chars(wanted.data(), wanted.data() + wanted.size(), number);
  if (error == std::errc() && end == wanted.data() + wanted.size()) {
    if (number >= 1 && number <= analysis.models.size()) return &analysis.models[number - 1];
  } else {
    for (const network::RankedModel& ranked : analysis.models) {
      if (ranked.fit.name == wanted) return &ranked;
    }
  }
  std::vector<std::string> names;
  for (const network::RankedModel& ranked : analysis.models) names.push_back(ranked.fit.name);
  console.err << fmt::format(
      "--emit \"{}\": no such model was fitted; a number from 1 to {} or a name. {}\n", wanted,
      names.size(), core::name_hint(wanted, names));
  return nullptr;
}

/// The emitted case's text; empty after a complaint.
std::optional<std::string> emitted_text(const network::RankedModel& ranked,
                                        const LoadedTest& loaded,
                                        const std::optional<network::EmittedFeed>& feed,
                                        const CommandLine& line, Console& console) {
  for (const std::string& path : loaded.test.model_cases) {
    if (ranked.fit.name != path) continue;
    core::FaultList faults;
    const auto document = core::JsonDocument::read(loaded.document.folder() / path, faults);
    if (document) return network::emitted_network(document->root(), ranked.fit);
    console.err << faults.text();
    return std::nullopt;
  }
  auto text = network::emitted_case(loaded.test, ranked.fit, feed);
  if (text) return std::move(text.value());
  console.err << line.input << ": " << text.failure().text() << "\n";
  return std::nullopt;
}

std::string emitted_name(const std::string& model) {
  return std::filesystem::path(model).stem().string() + ".case.json";
}

int fail(const core::Failure& failure, const CommandLine& line, Console& console, int code) {
  console.err << line.input << ": " << failure.text() << "\n";
  return code;
}

std::optional<network::IntegrationRule> wanted_rule(const CommandLine& line, Console& console) {
  const auto rule = network::rule_of(line.rule);
  if (!rule) {
    static const std::vector<std::string> kRules = {"straight lines", "trapezoid", "simpson",
                                                    "equal-step sum"};
    console.err << fmt::format("stillzone tracer: --rule \"{}\" is no integration rule. {}\n",
                               line.rule, core::name_hint(line.rule, kRules));
  }
  return rule;
}

int analyse(const CommandLine& line, Console& console) {
  const auto log = make_log(line, console);
  const auto rule = wanted_rule(line, console);
  if (!rule) return kWrongCommandLine;
  if (line.feed && !line.emit) {
    console.err
        << "stillzone tracer: --feed belongs to --emit, which is not given. Add --emit 1.\n";
    return kWrongCommandLine;
  }
  std::optional<network::EmittedFeed> feed;
  if (line.feed) {
    feed = load_feed(*line.feed, console);
    if (!feed) return kWrongInput;
  }
  const auto loaded = load_test(line, console);
  if (!loaded) return kWrongInput;
  auto folder = core::OutputFolder::create(output_path(line));
  if (!folder) return fail(folder.failure(), line, console, kWrongInput);
  const network::TracerAnalysis analysis = network::analyse_tracer_test(
      loaded->test, loaded->networks, {.rule = *rule, .threads = line.threads});
  log->debug("{} models fitted, {} not", analysis.models.size(), analysis.failed.size());
  if (analysis.models.empty()) {
    console.err << line.input << ": no model could be fitted.\n";
    for (const auto& failed : analysis.failed) {
      console.err << "  " << failed.name << ": " << failed.reason << "\n";
    }
    return kNoSolution;
  }
  const std::string summary =
      tracer_summary(loaded->test, analysis, loaded->warnings).dump(2) + "\n";
  auto done = folder.value().write("summary.json", summary);
  if (done) done = folder.value().write("fits.csv", fits_csv(loaded->test, analysis));
  if (done) {
    done = folder.value().write("report.html",
                                tracer_report_page({.test = loaded->test,
                                                    .analysis = analysis,
                                                    .provenance = {.version = STILLZONE_VERSION,
                                                                   .input_name = line.input,
                                                                   .input_text = loaded->text,
                                                                   .command_line = line.whole,
                                                                   .date = time_of_writing()},
                                                    .remarks = loaded->warnings}));
  }
  std::string files = "summary.json, fits.csv, report.html";
  if (line.emit && done) {
    const network::RankedModel* ranked = chosen_model(*line.emit, analysis, console);
    if (ranked == nullptr) return kWrongCommandLine;
    const auto text = emitted_text(*ranked, *loaded, feed, line, console);
    if (!text) return kNoSolution;
    done = folder.value().write(emitted_name(ranked->fit.name), *text);
    files += ", " + emitted_name(ranked->fit.name);
  }
  if (done) done = folder.value().commit();
  if (!done) return fail(done.failure(), line, console, kWrongInput);
  if (line.json) {
    console.out << summary;
    return kDone;
  }
  console.out << tracer_tables(loaded->test, analysis, loaded->warnings) << "\nWritten to "
              << output_path(line).string() << ": " << files << "\n";
  return kDone;
}

}  // namespace

Command tracer_command() {
  return {.name = "tracer",
          .summary = "reads a tracer test, fits zone models to it and ranks them",
          .input_name = "TEST",
          .input_meaning = "test file",
          .input_needed = true,
          .example = "stillzone tracer cases/lithium_test.json --emit 1",
          .writes_output = true,
          .reads_case = true,
          .emits_case = true,
          .run = analyse};
}

}  // namespace stillzone::cli
