#include "core/continuation/continuation.hpp"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <functional>

#include "core/continuation/spectrum.hpp"

namespace stillzone::core {
namespace {

/// Small dense systems with closed-form branches.
class SmallSystem final : public DaeSystem {
 public:
  using Rates = std::function<void(std::span<const double>, double, std::span<double>)>;
  using Jacobian = std::function<void(std::span<const double>, double, std::span<double>)>;

  SmallSystem(std::vector<std::uint8_t> differential, Rates rates, Jacobian by_columns)
      : differential_(std::move(differential)),
        floors_(differential_.size(), 1e-3),
        rates_(std::move(rates)),
        jacobian_(std::move(by_columns)) {
    std::vector<SparsePattern::Entry> entries;
    const auto n = static_cast<std::int64_t>(differential_.size());
    for (std::int64_t i = 0; i < n; ++i) {
      for (std::int64_t j = 0; j < n; ++j) entries.push_back({i, j});
    }
    pattern_ = SparsePattern::of(n, std::move(entries));
  }

  std::size_t n_unknowns() const override { return differential_.size(); }
  std::size_t n_quadratures() const override { return 0; }
  std::span<const std::uint8_t> differential() const override { return differential_; }
  std::span<const double> floors() const override { return floors_; }
  const SparsePattern& pattern() const override { return pattern_; }
  void rates(std::span<const double> y, std::span<double> f) override { rates_(y, p, f); }
  void jacobian(std::span<const double> y, std::span<double> values) override {
    jacobian_(y, p, values);
  }
  void quadrature_rates(std::span<const double>, std::span<double>) override {}
  void quadrature_rates_along(std::span<const double>, std::span<const double>,
                              std::span<double>) override {}
  std::optional<double> next_switch(double) const override { return std::nullopt; }
  void enter(double) override {}
  std::size_t interval_kind() const override { return 0; }
  Result<Done> make_consistent(std::span<double>) override { return Done{}; }
  std::string unknown_place(std::size_t) const override { return "here"; }
  std::string unknown_quantity(std::size_t) const override { return "x"; }

  double p = 0.0;

 private:
  std::vector<std::uint8_t> differential_;
  std::vector<double> floors_;
  SparsePattern pattern_;
  Rates rates_;
  Jacobian jacobian_;
};

class SmallProblem final : public ParametricSystem {
 public:
  using Derivative = std::function<void(std::span<const double>, double, std::span<double>)>;
  SmallProblem(SmallSystem& system, Derivative derivative)
      : system_(system), derivative_(std::move(derivative)) {}
  DaeSystem& system() override { return system_; }
  void set_parameter(double p) override { system_.p = p; }
  void parameter_derivative(std::span<const double> y, std::span<double> df) override {
    derivative_(y, system_.p, df);
  }

 private:
  SmallSystem& system_;
  Derivative derivative_;
};

/// Haldane growth as a chemostat's substrate branch: mu(S) = D, one unknown S, parameter D.
struct HaldaneBranch {
  static constexpr double kMax = 0.74;
  static constexpr double kHalf = 9.28;
  static constexpr double kInhibition = 256.0;
  static double rate(double s) { return kMax * s / (kHalf + s + s * s / kInhibition); }
  static double slope(double s) {
    const double below = kHalf + s + s * s / kInhibition;
    return kMax * (kHalf - s * s / kInhibition) / (below * below);
  }
  SmallSystem system{{1},
                     [](auto y, double p, auto f) { f[0] = p - rate(y[0]); },
                     [](auto y, double, auto v) { v[0] = -slope(y[0]); }};
  SmallProblem problem{system, [](auto, double, auto df) { df[0] = 1.0; }};
};

/// Goes on from `at` until the parameter turns round; returns the located fold.
Result<BranchPoint> first_fold(Continuation& continuation, BranchPoint at) {
  const double direction = at.tangent_parameter;
  for (int k = 0; k < 500; ++k) {
    auto next = continuation.advance(at);
    if (!next) return next.failure();
    if (next.value().tangent_parameter * direction < 0.0) {
      return continuation.locate_fold(at, next.value(), continuation.last_step());
    }
    at = std::move(next).value();
  }
  return Failure{.reason = "no fold in 500 steps"};
}

TEST(Continuation, FoldOfHaldaneGrowthLiesAtItsPeak) {
  HaldaneBranch branch;
  const auto solver = make_klu_solver(branch.system.pattern());
  Continuation continuation(branch.problem, *solver, {});
  const std::array<double, 1> y{3.0};
  auto start = continuation.start(y, 0.2, 1.0);
  ASSERT_TRUE(start.ok()) << start.failure().text();
  const auto fold = first_fold(continuation, start.value());
  ASSERT_TRUE(fold.ok()) << fold.failure().text();
  // S = sqrt(Ks KI), mu = mumax / (1 + 2 sqrt(Ks / KI))
  EXPECT_NEAR(fold.value().parameter, 0.74 / (1.0 + 2.0 * std::sqrt(9.28 / 256.0)), 1e-12);
  EXPECT_NEAR(fold.value().y[0], std::sqrt(9.28 * 256.0), 1e-3);
}

TEST(Continuation, FollowsTheBranchPastItsFold) {
  HaldaneBranch branch;
  const auto solver = make_klu_solver(branch.system.pattern());
  Continuation continuation(branch.problem, *solver, {});
  const std::array<double, 1> y{3.0};
  auto at = continuation.start(y, 0.2, 1.0);
  ASSERT_TRUE(at.ok());
  while (at && !(at.value().y[0] > 200.0)) at = continuation.advance(at.value());
  ASSERT_TRUE(at.ok()) << at.failure().text();
  EXPECT_LT(at.value().tangent_parameter, 0.0);
  EXPECT_NEAR(at.value().parameter, HaldaneBranch::rate(at.value().y[0]), 1e-12);
}

TEST(Continuation, PassesBothFoldsOfACubic) {
  // p = x^3 - 3 x with x = y - 3 (so that no unknown passes 0): folds at x = -1 (p = 2), 1 (p =
  // -2).
  SmallSystem system(
      {1},
      [](auto y, double p, auto f) {
        const double x = y[0] - 3.0;
        f[0] = p - 10.0 - (x * x * x - 3.0 * x);
      },
      [](auto y, double, auto v) {
        const double x = y[0] - 3.0;
        v[0] = -(3.0 * x * x - 3.0);
      });
  SmallProblem problem(system, [](auto, double, auto df) { df[0] = 1.0; });
  const auto solver = make_klu_solver(system.pattern());
  Continuation continuation(problem, *solver, {});
  const std::array<double, 1> y{1.0};
  auto start = continuation.start(y, 8.0, 1.0);
  ASSERT_TRUE(start.ok()) << start.failure().text();
  const auto upper = first_fold(continuation, start.value());
  ASSERT_TRUE(upper.ok()) << upper.failure().text();
  EXPECT_NEAR(upper.value().parameter, 12.0, 1e-10);
  auto past = continuation.at_distance(upper.value(), 0.05);
  ASSERT_TRUE(past.ok());
  const auto lower = first_fold(continuation, past.value());
  ASSERT_TRUE(lower.ok()) << lower.failure().text();
  EXPECT_NEAR(lower.value().parameter, 8.0, 1e-10);
}

TEST(Continuation, TangentIsTheBranchsDirection) {
  HaldaneBranch branch;
  const auto solver = make_klu_solver(branch.system.pattern());
  Continuation continuation(branch.problem, *solver, {});
  const std::array<double, 1> y{11.5};
  const auto at = continuation.start(y, 0.4, 1.0);
  ASSERT_TRUE(at.ok());
  const double by_parameter = at.value().tangent[0] / at.value().tangent_parameter;
  EXPECT_NEAR(by_parameter, 1.0 / HaldaneBranch::slope(at.value().y[0]), 1e-9);
}

TEST(Spectrum, AlgebraicUnknownsAreEliminated) {
  // x' = -2 x + z, 0 = z - 0.5 x: x' = -1.5 x.
  SmallSystem system(
      {1, 0},
      [](auto y, double, auto f) {
        f[0] = -2.0 * y[0] + y[1];
        f[1] = y[1] - 0.5 * y[0];
      },
      [](auto, double, auto v) {
        v[0] = -2.0;
        v[1] = -0.5;
        v[2] = 1.0;
        v[3] = 1.0;
      });
  const std::array<double, 2> y{1.0, 0.5};
  const auto spectrum = spectrum_at(system, y, 10);
  ASSERT_TRUE(spectrum.has_value());
  EXPECT_NEAR(spectrum->dominant.real(), -1.5, 1e-14);
  EXPECT_TRUE(spectrum->stable());
}

TEST(Spectrum, IsNotWorkedOutBeyondTheLimit) {
  HaldaneBranch branch;
  const std::array<double, 1> y{3.0};
  EXPECT_FALSE(spectrum_at(branch.system, y, 0).has_value());
}

TEST(Spectrum, AbscissaOfATwoTankLoopIsItsSlowerRoot) {
  // Levenspiel's two regions: V 0.7 and 0.3, exchange 0.1, flow 1: roots of the 2 x 2 matrix.
  const std::array<double, 4> a{-1.1 / 0.7, 0.1 / 0.7, 0.1 / 0.3, -0.1 / 0.3};
  const double trace = a[0] + a[3];
  const double determinant = a[0] * a[3] - a[1] * a[2];
  const double slower = 0.5 * (trace + std::sqrt(trace * trace - 4.0 * determinant));
  EXPECT_NEAR(spectral_abscissa(a, 2).value_or(0.0), slower, 1e-14);
}

}  // namespace
}  // namespace stillzone::core
