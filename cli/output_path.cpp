#include "cli/output_path.hpp"

#include <fmt/format.h>

#include <ctime>

namespace stillzone::cli {

std::filesystem::path output_path(const CommandLine& line) {
  if (line.out) return *line.out;
  return std::filesystem::path(line.input).stem().string() + ".out";
}

std::string time_of_writing() {
  const std::time_t now = std::time(nullptr);
  std::tm calendar{};
  gmtime_r(&now, &calendar);
  return fmt::format("{:04}-{:02}-{:02} {:02}:{:02} UTC", calendar.tm_year + 1900,
                     calendar.tm_mon + 1, calendar.tm_mday, calendar.tm_hour, calendar.tm_min);
}

}  // namespace stillzone::cli
