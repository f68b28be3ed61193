#pragma once

#include <ostream>
#include <string>
#include <vector>

namespace stillzone::cli {

/// The whole program but for `main`: takes the arguments after the program's name, writes to the
/// two streams, returns the exit code (0, 1, 2 or 3; defects are thrown).
int run(const std::vector<std::string>& arguments, std::ostream& out, std::ostream& err,
        bool err_is_terminal = false);

}  // namespace stillzone::cli
