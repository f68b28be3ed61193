#pragma once

#include <optional>
#include <string>
#include <string_view>

namespace stillzone::kinetics {

/// A number with a model's unit behind it: "7 1/d", "0.15 kg COD/m3"; no unit is the unit "1".
struct WrittenValue {
  double value = 0.0;
  std::string unit;
};
/// Empty when the text does not start with a finite number.
[[nodiscard]] std::optional<WrittenValue> split_value(std::string_view text);

}  // namespace stillzone::kinetics
