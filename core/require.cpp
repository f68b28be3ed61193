#include "core/require.hpp"

#include <string_view>

namespace stillzone::core {

void throw_defect(const char* condition, const char* file, int line, const std::string& values) {
  std::string_view name(file);
  if (const auto slash = name.rfind('/'); slash != std::string_view::npos) {
    name.remove_prefix(slash + 1);
  }
  throw ProgramDefect(
      fmt::format("{}:{}: required {} does not hold: {}", name, line, condition, values));
}

}  // namespace stillzone::core
