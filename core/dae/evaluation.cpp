#include "core/dae/evaluation.hpp"

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <string>
#include <utility>

#include "core/require.hpp"

namespace stillzone::core {
namespace {

#ifdef NDEBUG
constexpr bool kMarkOutputs = false;
#else
constexpr bool kMarkOutputs = true;
#endif

// A quiet NaN whose payload no arithmetic of a model produces.
constexpr std::uint64_t kMark = 0x7ff8'0000'5354'5a4eU;

void mark(std::span<double> output) {
  if constexpr (kMarkOutputs) std::fill(output.begin(), output.end(), std::bit_cast<double>(kMark));
}

std::optional<std::size_t> left_out(std::span<const double> output) {
  if constexpr (kMarkOutputs) {
    const auto place = std::find_if(output.begin(), output.end(), [](double x) {
      return std::bit_cast<std::uint64_t>(x) == kMark;
    });
    if (place != output.end()) return static_cast<std::size_t>(place - output.begin());
  }
  return std::nullopt;
}

}  // namespace

void evaluate_rates(DaeSystem& system, std::span<const double> y, std::span<double> f) {
  mark(f);
  system.rates(y, f);
  if (const auto i = left_out(f)) {
    SZ_REQUIRE(!i, "rates() left out entry {} ({}, {})", *i, system.unknown_place(*i),
               system.unknown_quantity(*i));
  }
}

void evaluate_jacobian(DaeSystem& system, std::span<const double> y, std::span<double> values) {
  mark(values);
  system.jacobian(y, values);
  if (const auto k = left_out(values)) {
    const SparsePattern& pattern = system.pattern();
    const auto after =
        std::upper_bound(pattern.start.begin(), pattern.start.end(), static_cast<std::int64_t>(*k));
    const auto column = static_cast<std::size_t>(after - pattern.start.begin() - 1);
    const auto row = static_cast<std::size_t>(pattern.row[*k]);
    SZ_REQUIRE(!k, "jacobian() left out entry {}: d({}, {}) / d({}, {})", *k,
               system.unknown_place(row), system.unknown_quantity(row),
               system.unknown_place(column), system.unknown_quantity(column));
  }
}

void evaluate_quadratures(DaeSystem& system, std::span<const double> y, std::span<double> g) {
  mark(g);
  system.quadrature_rates(y, g);
  if (const auto i = left_out(g)) SZ_REQUIRE(!i, "quadrature_rates() left out entry {}", *i);
}

bool all_finite(std::span<const double> values) {
  double poison = 0.0;
  for (const double value : values) poison += 0.0 * value;
  return std::isfinite(poison);
}

std::optional<std::size_t> first_not_finite(std::span<const double> values) {
  const auto place =
      std::find_if(values.begin(), values.end(), [](double x) { return !std::isfinite(x); });
  if (place == values.end()) return std::nullopt;
  return static_cast<std::size_t>(place - values.begin());
}

Failure failure_at(const DaeSystem& system, std::size_t i, double t, std::string reason,
                   std::string try_this) {
  Failure failure;
  failure.reason = std::move(reason);
  failure.time_d = t;
  if (i < system.n_unknowns()) {
    failure.place = system.unknown_place(i);
    failure.quantity = system.unknown_quantity(i);
  }
  failure.try_this = std::move(try_this);
  return failure;
}

}  // namespace stillzone::core
