#pragma once

#include <filesystem>
#include <string>

#include "cli/command_line.hpp"

namespace stillzone::cli {

/// The folder a command writes: --out, or NAME.out after the input file.
[[nodiscard]] std::filesystem::path output_path(const CommandLine& line);

/// Now, as reports and files carry it: "2026-01-31 14:05 UTC".
[[nodiscard]] std::string time_of_writing();

}  // namespace stillzone::cli
