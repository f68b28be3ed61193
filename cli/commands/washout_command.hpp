#pragma once

#include "cli/command_line.hpp"

namespace stillzone::cli {

[[nodiscard]] Command washout_command();

}  // namespace stillzone::cli
