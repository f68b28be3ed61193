#include "kinetics/model_unit.hpp"

#include <charconv>
#include <cmath>
#include <system_error>

namespace stillzone::kinetics {

namespace {

std::string_view trimmed(std::string_view text) {
  while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
  while (!text.empty() && text.back() == ' ') text.remove_suffix(1);
  return text;
}

}  // namespace

std::optional<WrittenValue> split_value(std::string_view text) {
  text = trimmed(text);
  double value = 0.0;
  const auto [end, code] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (code != std::errc() || !std::isfinite(value)) return std::nullopt;
  const std::string_view unit = trimmed(text.substr(static_cast<std::size_t>(end - text.data())));
  return WrittenValue{value, unit.empty() ? "1" : std::string(unit)};
}

}  // namespace stillzone::kinetics
