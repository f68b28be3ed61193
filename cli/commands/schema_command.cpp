#include "cli/commands/schema_command.hpp"

#include <fmt/format.h>

#include "cli/schemas/published_schemas.hpp"
#include "core/near_name.hpp"

namespace stillzone::cli {
namespace {

int show(const CommandLine& line, Console& console) {
  const std::string name = line.input.empty() ? "case" : line.input;
  const std::string_view text = published_schema(name);
  if (text.empty()) {
    console.err << fmt::format("stillzone schema: there is no schema \"{}\". {}\n", name,
                               core::name_hint(name, published_schemas()));
    return kWrongCommandLine;
  }
  console.out << text;
  return kDone;
}

}  // namespace

Command schema_command() {
  return {.name = "schema",
          .summary = "prints the JSON Schema of an input file, for editors",
          .input_name = "KIND",
          .input_meaning = "case (default), test or model",
          .input_needed = false,
          .example = "stillzone schema case > case.schema.json",
          .writes_output = false,
          .reads_case = false,
          .run = show};
}

}  // namespace stillzone::cli
