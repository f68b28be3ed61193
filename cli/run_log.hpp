#pragma once

#include <memory>

#include "cli/command_line.hpp"

namespace spdlog {
class logger;
}

namespace stillzone::cli {

/// The log of one command: lines on console.err at the level of --log-level; --quiet silences it.
[[nodiscard]] std::shared_ptr<spdlog::logger> make_log(const CommandLine& line, Console& console);

}  // namespace stillzone::cli
