#pragma once

#include "cli/command_line.hpp"

namespace stillzone::cli {

[[nodiscard]] Command tracer_command();

}  // namespace stillzone::cli
