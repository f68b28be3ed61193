#include "cli/run_log.hpp"

#include <spdlog/sinks/ostream_sink.h>
#include <spdlog/spdlog.h>

namespace stillzone::cli {

std::shared_ptr<spdlog::logger> make_log(const CommandLine& line, Console& console) {
  // A logger of our own: the library's registry of loggers is global and stays unused.
  auto sink = std::make_shared<spdlog::sinks::ostream_sink_st>(console.err);
  auto log = std::make_shared<spdlog::logger>("stillzone", std::move(sink));
  log->set_pattern("[%H:%M:%S.%e] %l: %v");
  log->set_level(console.quiet ? spdlog::level::off : spdlog::level::from_str(line.log_level));
  return log;
}

}  // namespace stillzone::cli
