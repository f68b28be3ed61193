#pragma once

#include <chrono>

#include "cli/console.hpp"

namespace stillzone::cli {

/// A line on stderr that shows how far a long computation is: only on a terminal, only after the
/// first second, redrawn at most ten times a second, wiped at the end.
class Progress {
 public:
  explicit Progress(Console& console);
  ~Progress();
  Progress(const Progress&) = delete;
  Progress& operator=(const Progress&) = delete;

  /// @param share 0 to 1 when known, else < 0; @param time_d model time reached [d].
  void show(double share, double time_d);

 private:
  Console& console_;
  std::chrono::steady_clock::time_point start_;
  std::chrono::steady_clock::time_point drawn_;
  bool visible_ = false;
};

}  // namespace stillzone::cli
