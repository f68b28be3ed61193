#pragma once

#include "cli/command_line.hpp"

namespace stillzone::cli {

[[nodiscard]] Command run_command();

}  // namespace stillzone::cli
