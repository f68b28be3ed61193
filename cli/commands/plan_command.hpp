#pragma once

#include "cli/command_line.hpp"

namespace stillzone::cli {

[[nodiscard]] Command plan_command();

}  // namespace stillzone::cli
