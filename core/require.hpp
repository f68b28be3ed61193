#pragma once

#include <fmt/format.h>

#include <stdexcept>
#include <string>

namespace stillzone::core {

/// A defect of ours: a caller broke a function's contract. Thrown in release builds too; `main`
/// catches it once and exits 70.
class ProgramDefect : public std::logic_error {
 public:
  using std::logic_error::logic_error;
};

[[noreturn]] void throw_defect(const char* condition, const char* file, int line,
                               const std::string& values);

}  // namespace stillzone::core

/// SZ_REQUIRE(n == m, "n {} m {}", n, m): checks a programmer's contract and shows the values.
#define SZ_REQUIRE(condition, ...)                                                                 \
  do {                                                                                             \
    if (!(condition)) {                                                                            \
      ::stillzone::core::throw_defect(#condition, __FILE__, __LINE__, ::fmt::format(__VA_ARGS__)); \
    }                                                                                              \
  } while (false)
