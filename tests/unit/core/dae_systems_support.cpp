#include "tests/unit/core/dae_systems_support.hpp"

#include <algorithm>
#include <utility>

namespace stillzone::test {
namespace {

core::SparsePattern full_pattern(std::size_t n) {
  std::vector<core::SparsePattern::Entry> entries;
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = 0; j < n; ++j) {
      entries.push_back({static_cast<std::int64_t>(i), static_cast<std::int64_t>(j)});
    }
  }
  return core::SparsePattern::of(static_cast<std::int64_t>(n), std::move(entries));
}

Eigen::Map<const Eigen::VectorXd> as_vector(std::span<const double> x) {
  return {x.data(), static_cast<Eigen::Index>(x.size())};
}

Eigen::Map<Eigen::VectorXd> as_vector(std::span<double> x) {
  return {x.data(), static_cast<Eigen::Index>(x.size())};
}

}  // namespace

FunctionSystem::FunctionSystem(std::size_t n, Rates rates, Jacobian jacobian)
    : differential_flags(n, 1),
      floor_values(n, 1e-6),
      n_(n),
      rates_(std::move(rates)),
      jacobian_(std::move(jacobian)),
      pattern_(full_pattern(n)),
      dense_(static_cast<Eigen::Index>(n), static_cast<Eigen::Index>(n)) {}

void FunctionSystem::rates(Vector y, std::span<double> f) {
  ++rate_calls;
  rates_(y, f);
}

void FunctionSystem::jacobian(Vector y, std::span<double> values) {
  ++jacobian_calls;
  dense_.setZero();
  jacobian_(y, dense_);
  std::copy_n(dense_.data(), values.size(), values.begin());  // column-major, as the full pattern
}

void FunctionSystem::quadrature_rates(Vector y, std::span<double> g) { quadrature(y, g); }

void FunctionSystem::quadrature_rates_along(Vector y, Vector v, std::span<double> gv) {
  quadrature_along(y, v, gv);
}

std::optional<double> FunctionSystem::next_switch(double t) const {
  const auto next = std::ranges::upper_bound(switch_times, t);
  if (next == switch_times.end()) return std::nullopt;
  return *next;
}

void FunctionSystem::enter(double t) {
  if (on_enter) on_enter(t);
}

core::Result<core::Done> FunctionSystem::make_consistent(std::span<double> y) {
  if (consistent) return consistent(y);
  return core::Done{};
}

std::string FunctionSystem::unknown_place(std::size_t i) const {
  return "zone " + std::to_string(i / 2);
}

std::string FunctionSystem::unknown_quantity(std::size_t i) const {
  return i % 2 == 0 ? "substrate" : "biomass";
}

std::unique_ptr<FunctionSystem> linear_system(const Eigen::MatrixXd& a, const Eigen::VectorXd& b,
                                              const Eigen::MatrixXd& c) {
  auto system = std::make_unique<FunctionSystem>(
      static_cast<std::size_t>(a.rows()),
      [a, b](std::span<const double> y, std::span<double> f) {
        as_vector(f) = a * as_vector(y) + b;
      },
      [a](std::span<const double> /*y*/, Eigen::MatrixXd& j) { j = a; });
  system->quadratures = static_cast<std::size_t>(c.rows());
  system->quadrature = [c](std::span<const double> y, std::span<double> g) {
    as_vector(g) = c * as_vector(y);
  };
  system->quadrature_along = [c](std::span<const double> /*y*/, std::span<const double> v,
                                 std::span<double> gv) { as_vector(gv) = c * as_vector(v); };
  return system;
}

}  // namespace stillzone::test
