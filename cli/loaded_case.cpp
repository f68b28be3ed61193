#include "cli/loaded_case.hpp"

#include <fstream>
#include <sstream>
#include <utility>

#include "core/units.hpp"

namespace stillzone::cli {

std::optional<LoadedCase> load_case(const CommandLine& line, Console& console) {
  core::FaultList faults;
  auto document = core::JsonDocument::read(line.input, faults);
  if (document) {
    for (const std::string& setting : line.settings) document->set(setting, faults);
  }
  std::optional<network::Case> the_case;
  std::optional<network::FlowBalance> balance;
  if (document && faults.empty()) {
    const core::UnitReader units;
    the_case = network::read_case(*document, units, faults);
    if (the_case) balance = network::FlowBalance::solve(*the_case, *document, faults);
  }
  if (!faults.empty() || !balance) {
    console.err << faults.text();
    return std::nullopt;
  }
  std::ifstream file(line.input, std::ios::binary);
  std::ostringstream text;
  text << file.rdbuf();
  return LoadedCase{.document = std::move(*document),
                    .the_case = std::move(*the_case),
                    .balance = std::move(*balance),
                    .text = std::move(text).str()};
}

}  // namespace stillzone::cli
