#pragma once

#include "cli/command_line.hpp"

namespace stillzone::cli {

[[nodiscard]] Command schema_command();

}  // namespace stillzone::cli
