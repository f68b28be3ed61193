#include "core/near_name.hpp"

#include <algorithm>
#include <cctype>
#include <vector>

namespace stillzone::core {
namespace {

std::string lower(std::string_view text) {
  std::string result(text);
  for (char& c : result) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
  return result;
}

/// Damerau-Levenshtein distance with adjacent swaps (optimal string alignment).
std::size_t distance(const std::string& a, const std::string& b) {
  const std::size_t width = b.size() + 1;
  std::vector<std::size_t> d((a.size() + 1) * width);
  for (std::size_t i = 0; i <= a.size(); ++i) {
    for (std::size_t j = 0; j <= b.size(); ++j) {
      std::size_t& here = d[i * width + j];
      if (i == 0 || j == 0) {
        here = i + j;
        continue;
      }
      const std::size_t change = a[i - 1] == b[j - 1] ? 0 : 1;
      here = std::min({d[(i - 1) * width + j] + 1, d[i * width + j - 1] + 1,
                       d[(i - 1) * width + j - 1] + change});
      if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) {
        here = std::min(here, d[(i - 2) * width + j - 2] + 1);
      }
    }
  }
  return d.back();
}

}  // namespace

std::optional<std::string> nearest_name(std::string_view written,
                                        std::span<const std::string> known) {
  if (written.size() > 64) return std::nullopt;
  const std::string wanted = lower(written);
  std::optional<std::string> best;
  std::size_t best_distance = std::max<std::size_t>(1, written.size() / 3) + 1;
  for (const std::string& name : known) {
    if (name.size() > 64) continue;
    const std::size_t found = distance(wanted, lower(name));
    if (found < best_distance) {
      best_distance = found;
      best = name;
    }
  }
  return best;
}

std::string name_hint(std::string_view written, std::span<const std::string> known) {
  if (const auto near = nearest_name(written, known)) return "Did you mean \"" + *near + "\"?";
  if (known.empty()) return {};
  constexpr std::size_t kMost = 12;
  std::string hint = "Known are: ";
  for (std::size_t i = 0; i < std::min(known.size(), kMost); ++i) {
    hint += (i == 0 ? "" : ", ") + known[i];
  }
  hint += known.size() > kMost ? ", ..." : ".";
  return hint;
}

}  // namespace stillzone::core
