#include "cli/command_line.hpp"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <utility>

#include "core/near_name.hpp"

namespace stillzone::cli {
namespace {

const std::vector<std::string>& log_levels() {
  static const std::vector<std::string> levels = {"debug", "info", "warning", "error", "off"};
  return levels;
}

void add_flags(CLI::App& app, const Command& command, CommandLine& line) {
  auto* input = app.add_option(command.input_name, line.input, command.input_meaning);
  if (command.input_needed) input->required();
  if (command.writes_output) {
    app.add_option("--out", line.out, "folder to write, replaced as a whole (default ./NAME.out)");
    app.add_flag("--json", line.json, "print summary.json alone on standard output");
  }
  if (command.reads_case) {
    app.add_option("--set", line.settings, "change one value: /json/pointer=value (repeatable)")
        ->take_all()
        ->allow_extra_args(false);
  }
  if (command.emits_case) {
    app.add_option("--emit", line.emit,
                   "write a fitted model as a case: its number in the ranking, or its name");
    app.add_option(
        "--feed", line.feed,
        "JSON file with the feed of that case: {\"NAME\": {\"flow\": .., \"state\": ..}}, "
        "or a case whose feed is taken");
    app.add_option("--rule", line.rule,
                   "integration rule of the moments: straight lines (default), trapezoid, simpson, "
                   "equal-step sum");
  }
  app.add_option("--threads", line.threads, "threads to use (default: one per processor)")
      ->check(CLI::Range(1, 1024));
  app.add_flag("--quiet", line.quiet, "no progress and no log lines");
  app.add_option("--log-level", line.log_level, "debug, info, warning, error or off")
      ->check(CLI::IsMember(log_levels()));
  app.footer("Example:\n  " + command.example);
}

std::vector<std::string> names_of(const std::vector<Command>& commands) {
  std::vector<std::string> names;
  for (const Command& command : commands) names.push_back(command.name);
  return names;
}

/// Commands of the contract that later versions bring.
bool comes_later(const std::string& name) {
  static const std::vector<std::string> later = {"retrofit", "calibrate"};
  return std::find(later.begin(), later.end(), name) != later.end();
}

Parsed complain(Console& console, const std::string& text, const std::string& help_of) {
  console.err << text << "\n"
              << fmt::format("`stillzone help{}` shows what can be typed.\n",
                             help_of.empty() ? "" : " " + help_of);
  return {.line = std::nullopt, .command = nullptr, .exit_code = kWrongCommandLine};
}

/// Flags a command knows, for "did you mean".
std::vector<std::string> flags_of(const CLI::App& app) {
  std::vector<std::string> flags;
  for (const CLI::Option* option : app.get_options()) {
    for (const std::string& name : option->get_lnames()) flags.push_back("--" + name);
  }
  return flags;
}

std::string parse_complaint(const CLI::App& app, const Command& command,
                            const CLI::ParseError& error) {
  const auto extras = app.remaining();
  if (!extras.empty()) {
    const std::string& first = extras.front();
    if (first.rfind("--", 0) != 0) {
      return fmt::format("stillzone {}: \"{}\" is one argument too many; it takes one {}.",
                         command.name, first, command.input_name);
    }
    const std::string flag = first.substr(0, first.find('='));
    if (flag == "--samples" || flag == "--seed") {
      return fmt::format("stillzone {}: flag \"{}\" is not in this version yet.", command.name,
                         flag);
    }
    return fmt::format("stillzone {}: flag \"{}\" is not known here. {}", command.name, flag,
                       core::name_hint(flag, flags_of(app)));
  }
  if (dynamic_cast<const CLI::RequiredError*>(&error) != nullptr) {
    return fmt::format("stillzone {}: no {} was given.", command.name, command.input_name);
  }
  return fmt::format("stillzone {}: {}.", command.name, error.what());
}

std::string overview(const CLI::App& app, const std::vector<Command>& commands) {
  std::string text = app.get_description() + "\n\nUsage: stillzone COMMAND INPUT [FLAGS]\n\n";
  for (const Command& command : commands) {
    text += fmt::format("  {:<22}{}\n", command.name + " " + command.input_name, command.summary);
  }
  text += "  help COMMAND          flags of a command and an example\n\n";
  text += "  --version             version of this program\n\n";
  text += "Exit codes: 0 done, 1 wrong input, 2 wrong command line, 3 no solution, 70 a defect.\n";
  return text;
}

}  // namespace

Parsed parse_command_line(const std::vector<std::string>& arguments,
                          const std::vector<Command>& commands, Console& console) {
  CLI::App app("Stillzone: poorly mixed anaerobic digesters as networks of well-mixed zones.");
  const std::vector<std::string> names = names_of(commands);
  if (arguments.empty()) {
    console.err << overview(app, commands);
    return {.line = std::nullopt, .command = nullptr, .exit_code = kWrongCommandLine};
  }
  std::string name = arguments.front();
  std::vector<std::string> rest(arguments.begin() + 1, arguments.end());
  if (name == "--version") {
    console.out << "stillzone " STILLZONE_VERSION "\n";
    return {};
  }
  bool help = name == "help" || name == "--help" || name == "-h";
  if (help && rest.empty()) {
    console.out << overview(app, commands);
    return {};
  }
  if (help) name = rest.front();
  const auto found = std::find(names.begin(), names.end(), name);
  if (found == names.end()) {
    if (comes_later(name)) {
      return complain(console, fmt::format("stillzone: \"{}\" is not in this version yet.", name),
                      "");
    }
    return complain(
        console,
        fmt::format("stillzone: \"{}\" is no command. {}", name, core::name_hint(name, names)), "");
  }
  const Command& command = commands[static_cast<std::size_t>(found - names.begin())];
  CommandLine line;
  line.command = name;
  line.whole = "stillzone";
  for (const std::string& argument : arguments) {
    line.whole += argument.find(' ') == std::string::npos ? " " + argument : " '" + argument + "'";
  }
  CLI::App sub(command.summary, "stillzone " + name);
  add_flags(sub, command, line);
  if (help) {
    console.out << sub.help();
    return {};
  }
  try {
    std::reverse(rest.begin(), rest.end());  // CLI11 takes its vector from the back
    sub.parse(rest);
  } catch (const CLI::CallForHelp&) {
    console.out << sub.help();
    return {};
  } catch (const CLI::ParseError& error) {
    return complain(console, parse_complaint(sub, command, error), name);
  }
  for (const std::string& setting : line.settings) {
    if (setting.rfind('/', 0) == 0 && setting.find('=') != std::string::npos) continue;
    return complain(
        console,
        fmt::format("stillzone {}: --set \"{}\" is not \"/json/pointer=value\". Write for "
                    "example --set \"/zones/core/volume=900 m3\".",
                    name, setting),
        name);
  }
  if (line.out && line.out->empty()) {
    return complain(console, fmt::format("stillzone {}: --out names no folder.", name), name);
  }
  return {.line = std::move(line), .command = &command, .exit_code = kDone};
}

}  // namespace stillzone::cli
