#pragma once

#include <optional>
#include <string>
#include <vector>

#include "cli/console.hpp"

namespace stillzone::cli {

/// What the user typed, taken apart.
struct CommandLine {
  std::string command;
  std::string input;  ///< the file or name the command works on; may be empty where optional
  std::optional<std::string> out;
  std::vector<std::string> settings;    ///< "/json/pointer=value"
  std::optional<std::string> emit;      ///< number or name of the model to write as a case
  std::optional<std::string> feed;      ///< file with the feed of that case
  std::string rule = "straight lines";  ///< integration rule of a tracer curve
  int threads = 0;                      ///< 0: one per processor
  bool json = false;
  bool quiet = false;
  std::string log_level = "info";
  std::string whole;  ///< as typed, for provenance
};

/// One command of the program: its place in the help, the flags it takes, and what it does.
struct Command {
  std::string name;
  std::string summary;
  std::string input_name;     ///< "CASE"
  std::string input_meaning;  ///< "case file"
  bool input_needed = true;
  std::string example;
  bool writes_output = false;  ///< takes --out and --json
  bool reads_case = false;     ///< takes --set
  bool emits_case = false;     ///< takes --emit, --feed and --rule
  int (*run)(const CommandLine& line, Console& console) = nullptr;
};

/// Either a command line to act on, or an exit code with everything already said.
struct Parsed {
  std::optional<CommandLine> line;
  const Command* command = nullptr;
  int exit_code = kDone;
};

/// Takes the arguments apart; prints help and version on console.out and complaints with "did you
/// mean" on console.err.
[[nodiscard]] Parsed parse_command_line(const std::vector<std::string>& arguments,
                                        const std::vector<Command>& commands, Console& console);

}  // namespace stillzone::cli
