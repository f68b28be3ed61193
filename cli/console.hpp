#pragma once

#include <ostream>

namespace stillzone::cli {

/// Where a command talks: results on `out`, everything else on `err`.
struct Console {
  std::ostream& out;
  std::ostream& err;
  bool err_is_terminal = false;  ///< then progress is drawn
  bool quiet = false;            ///< no progress, no log lines
};

/// Exit codes of the program.
enum ExitCode : int {
  kDone = 0,
  kWrongInput = 1,
  kWrongCommandLine = 2,
  kNoSolution = 3,
  kDefect = 70,
};

}  // namespace stillzone::cli
