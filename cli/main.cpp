#include <unistd.h>

#include <exception>
#include <iostream>
#include <string>
#include <vector>

#include "cli/console.hpp"
#include "cli/program.hpp"

int main(int count, char** values) {
  try {
    const std::vector<std::string> arguments(values + 1, values + count);
    const int code = stillzone::cli::run(arguments, std::cout, std::cerr, isatty(2) == 1);
    std::cout.flush();
    return code;
  } catch (const std::exception& defect) {
    std::cerr << "stillzone: a defect of this program: " << defect.what()
              << "\nPlease report it with the input that led here.\n";
    return stillzone::cli::kDefect;
  }
}
