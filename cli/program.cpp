#include "cli/program.hpp"

#include "cli/command_line.hpp"
#include "cli/commands/check_command.hpp"
#include "cli/commands/model_command.hpp"
#include "cli/commands/plan_command.hpp"
#include "cli/commands/run_command.hpp"
#include "cli/commands/schema_command.hpp"
#include "cli/commands/tracer_command.hpp"
#include "cli/commands/washout_command.hpp"

namespace stillzone::cli {
namespace {

/// A new command is one more line here and a file in cli/commands/.
std::vector<Command> all_commands() {
  return {check_command(),   run_command(),   tracer_command(), plan_command(),
          washout_command(), model_command(), schema_command()};
}

}  // namespace

int run(const std::vector<std::string>& arguments, std::ostream& out, std::ostream& err,
        bool err_is_terminal) {
  Console console{.out = out, .err = err, .err_is_terminal = err_is_terminal};
  const std::vector<Command> commands = all_commands();
  const Parsed parsed = parse_command_line(arguments, commands, console);
  if (!parsed.line) return parsed.exit_code;
  console.quiet = parsed.line->quiet;
  return parsed.command->run(*parsed.line, console);
}

}  // namespace stillzone::cli
