#include "cli/progress.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <string>

namespace stillzone::cli {
namespace {

constexpr std::chrono::milliseconds kQuietFor{1000};
constexpr std::chrono::milliseconds kBetween{100};
constexpr int kWidth = 30;

}  // namespace

Progress::Progress(Console& console)
    : console_(console), start_(std::chrono::steady_clock::now()), drawn_(start_) {}

Progress::~Progress() {
  if (visible_) console_.err << "\r\033[K" << std::flush;
}

void Progress::show(double share, double time_d) {
  if (console_.quiet || !console_.err_is_terminal) return;
  const auto now = std::chrono::steady_clock::now();
  if (now - start_ < kQuietFor || now - drawn_ < kBetween) return;
  drawn_ = now;
  visible_ = true;
  std::string line = fmt::format("day {:.1f}", time_d);
  if (share > 0.0) {
    const int filled = std::clamp(static_cast<int>(kWidth * share), 0, kWidth);
    const double passed = std::chrono::duration<double>(now - start_).count();
    line = fmt::format("[{}{}] {:3.0f} %  day {:.1f}  about {:.0f} s left",
                       std::string(static_cast<std::size_t>(filled), '='),
                       std::string(static_cast<std::size_t>(kWidth - filled), ' '), 100.0 * share,
                       time_d, passed * (1.0 - share) / share);
  }
  console_.err << "\r\033[K" << line << std::flush;
}

}  // namespace stillzone::cli
