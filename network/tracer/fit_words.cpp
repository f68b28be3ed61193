#include "network/tracer/fit_words.hpp"

#include <fmt/format.h>

#include <cmath>

namespace stillzone::network {
namespace {

std::string with_unit(double value, const std::string& unit) {
  return unit == "1" ? fmt::format("{:.3g}", value) : fmt::format("{:.4g} {}", value, unit);
}

}  // namespace

void judge_parameter(FittedParameter& p) {
  p.identified = false;
  if (std::isinf(p.standard_error)) {
    p.verdict = "not identified: this test does not see it";
    return;
  }
  if (!p.low && !p.high) {
    p.verdict = p.at_bound ? "not identified: at the bound of the search, and anything within the "
                             "bounds fits as well"
                           : "not identified: anything within the bounds fits as well";
    return;
  }
  if (!p.low) {
    const bool zero = p.bound_low <= 0.0;
    p.verdict =
        fmt::format("{}at most {} (95 %)", zero ? "not told apart from 0; " : "no lower limit; ",
                    with_unit(*p.high, p.unit));
    return;
  }
  if (!p.high) {
    p.verdict = fmt::format("no upper limit; at least {} (95 %)", with_unit(*p.low, p.unit));
    return;
  }
  if (*p.high - *p.low > 2.0 * std::abs(p.value)) {
    p.verdict = "poorly held: the interval is wider than twice the value";
    return;
  }
  p.identified = true;
  const double half = 0.5 * (*p.high - *p.low) / std::abs(p.value);
  p.verdict = half < 0.1 ? "well held" : half < 0.3 ? "held" : "roughly held";
}

void add_remarks(bool singular, bool ambiguous, ModelFit& fit) {
  const std::size_t n = fit.parameters.size();
  if (singular) {
    fit.remarks.emplace_back(
        "Some combination of the parameters is not determined at all by this test: other values "
        "fit exactly as well.");
  }
  if (ambiguous && !singular) {
    fit.remarks.emplace_back(
        "Other values, not near these, fit exactly as well (two tanks in a row may be swapped, for "
        "one): narrow the bounds to the ones that can be meant.");
  }
  for (std::size_t a = 0; a < n && !singular; ++a) {
    for (std::size_t b = a + 1; b < n; ++b) {
      const double correlation = fit.correlation[a * n + b];
      if (std::abs(correlation) < 0.95) continue;
      fit.remarks.push_back(
          fmt::format("{} and {} move together (correlation {:.3f}): the test fixes a combination "
                      "of them far better than each.",
                      fit.parameters[a].name, fit.parameters[b].name, correlation));
    }
  }
  if (fit.starts_agreeing == 1 && fit.starts_tried > 1) {
    fit.remarks.push_back(
        fmt::format("Only one of {} starts reached this minimum.", fit.starts_tried));
  }
}

}  // namespace stillzone::network
