#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

namespace stillzone::core {

/// The known name nearest to what was written (Damerau-Levenshtein distance, case ignored), or
/// none when nothing is near enough to be a slip of the pen (distance > max(1, length/3)).
[[nodiscard]] std::optional<std::string> nearest_name(std::string_view written,
                                                      std::span<const std::string> known);

/// "Did you mean \"volume\"?" or "Known are: a, b, c." (at most 12 names, then "...").
[[nodiscard]] std::string name_hint(std::string_view written, std::span<const std::string> known);

}  // namespace stillzone::core
