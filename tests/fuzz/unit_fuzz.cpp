// Written quantities with units.
#include <cmath>
#include <string>

#include "core/units.hpp"
#include "tests/fuzz/fuzz_support.hpp"

int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace stillzone;
  static const core::UnitReader units;
  const std::string_view text = fuzz::text_of(data, size);
  for (int k = 0; k <= static_cast<int>(core::Measure::share); ++k) {
    const auto measure = static_cast<core::Measure>(k);
    const auto reading = units.read(text, measure);
    fuzz::promise(reading.value.has_value() == reading.problem.empty(), "a value or a problem");
    if (reading.value) fuzz::promise(std::isfinite(*reading.value), "values are finite");
    std::string problem;
    const auto scale = units.scale_of(text, measure, problem);
    fuzz::promise(scale.has_value() == problem.empty(), "a scale or a problem");
    if (scale) fuzz::promise(std::isfinite(scale->scale), "scales are finite");
  }
  return 0;
}
