#include "network/digester_system.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <vector>

#include "core/dae/evaluation.hpp"
#include "network/start_state.hpp"
#include "tests/case_runner.hpp"
#include "tests/unit/network/network_cases_support.hpp"

namespace stillzone::network {
namespace {

using testing::every_flow_case;
using testing::kSludge;
using testing::load_text;

constexpr const char* kRun = R"({ "kind": "dynamic", "start": "seeded", "until": "1 d" })";

/// A state away from any special point: every unknown differs from place to place.
std::vector<double> uneven_state(const Case& the_case, const StateLayout& layout) {
  std::vector<double> y = seeded_state(the_case, layout);
  for (std::size_t k = 0; k < y.size(); ++k) {
    const auto at = layout.position(k);
    const double wobble = 0.5 + 0.5 * std::abs(std::sin(1.7 * static_cast<double>(k) + 0.3));
    if (at.in_zone && at.item >= layout.n_components()) {
      y[k] += 0.2 * (wobble - 0.75);
    } else if (at.in_zone) {
      y[k] = wobble * (y[k] > 0.0 ? y[k] : 1.0);
    } else {
      y[k] *= wobble;
    }
  }
  return y;
}

/// Central differences of sixth order of all of f along unknown j.
///   f' = (45 (f1 - f-1) - 9 (f2 - f-2) + (f3 - f-3)) / 60 h
std::vector<double> column_by_differences(DigesterSystem& system, std::vector<double> y,
                                          std::size_t j, double h) {
  std::vector<double> sum(y.size(), 0.0);
  std::vector<double> f(y.size());
  const double centre = y[j];
  const double weights[] = {45.0 / 60.0, -9.0 / 60.0, 1.0 / 60.0};
  for (int k = 1; k <= 3; ++k) {
    for (const int sign : {1, -1}) {
      y[j] = centre + sign * k * h;
      system.rates(y, f);
      for (std::size_t i = 0; i < y.size(); ++i) sum[i] += sign * weights[k - 1] * f[i] / h;
    }
  }
  return sum;
}

/// The exact Jacobian agrees with the differences everywhere, entries outside the pattern included
/// (0). The unit of the tolerance is the largest contribution of any unknown to the row.
void expect_exact_jacobian(DigesterSystem& system, const std::vector<double>& y) {
  const core::SparsePattern& pattern = system.pattern();
  const std::size_t n = system.n_unknowns();
  std::vector<double> values(static_cast<std::size_t>(pattern.n_entries()));
  core::evaluate_jacobian(system, y, values);
  std::vector<double> dense(n * n, 0.0);  // column after column
  std::vector<double> scale(n, 0.0);
  const auto floors = system.floors();
  const auto size = [&](std::size_t j) { return std::max(std::abs(y[j]), floors[j]); };
  for (std::size_t j = 0; j < n; ++j) {
    for (auto p = pattern.start[j]; p < pattern.start[j + 1]; ++p) {
      const auto i = static_cast<std::size_t>(pattern.row[static_cast<std::size_t>(p)]);
      const double value = values[static_cast<std::size_t>(p)];
      dense[j * n + i] = value;
      scale[i] = std::max(scale[i], std::abs(value) * size(j));
    }
  }
  for (std::size_t j = 0; j < n; ++j) {
    const double h = 1e-3 * (system.differential()[j] != 0 ? size(j) : 1.0);
    const auto differences = column_by_differences(system, y, j, h);
    for (std::size_t i = 0; i < n; ++i) {
      EXPECT_NEAR(dense[j * n + i], differences[i], 1e-9 * (scale[i] + 1e-12) / size(j))
          << "d(" << system.unknown_place(i) << " " << system.unknown_quantity(i) << ") / d("
          << system.unknown_place(j) << " " << system.unknown_quantity(j) << ")";
    }
  }
}

/// Invented.
constexpr const char* kTwoStepFeed = R"({ "S1": 9.5, "S2": 90, "Z": 120, "C": 130 })";

class EveryFlow : public ::testing::TestWithParam<std::pair<const char*, const char*>> {};

TEST_P(EveryFlow, JacobianIsExactInEveryOperatingStateAndStateOfThePipe) {
  const auto loaded = load_text(every_flow_case(GetParam().first, GetParam().second, kRun));
  ASSERT_NE(loaded, nullptr);
  // A wide blend, so that differences fit into it.
  DigesterSystem system(loaded->the_case, loaded->balance, {.pipe_opening_width = 0.5});
  std::vector<double> y = uneven_state(loaded->the_case, system.layout());
  for (const double t : {0.0, 0.084, 0.1, 0.99}) {  // feed off and on, mixing on and idle
    system.enter(t);
    for (const double gas : {0.2, 1.3, 4.0}) {  // shut, within the blend, open
      auto state = y;
      for (std::size_t h = 0; h < 2; ++h) {
        for (double& g : system.layout().gases(std::span(state), h)) g *= gas;
      }
      expect_exact_jacobian(system, state);
      if (::testing::Test::HasFailure()) return;
    }
  }
}

/// Along any direction the quadratures change as their derivative says.
TEST_P(EveryFlow, QuadraturesAlongADirectionAreExact) {
  const auto loaded = load_text(every_flow_case(GetParam().first, GetParam().second, kRun));
  ASSERT_NE(loaded, nullptr);
  DigesterSystem system(loaded->the_case, loaded->balance, {.pipe_opening_width = 0.5});
  system.enter(0.1);
  const std::vector<double> y = uneven_state(loaded->the_case, system.layout());
  std::vector<double> v(y.size());
  for (std::size_t k = 0; k < y.size(); ++k) {
    v[k] = y[k] * std::cos(2.3 * static_cast<double>(k));
  }
  std::vector<double> along(system.n_quadratures());
  system.quadrature_rates_along(y, v, along);
  std::vector<double> sum(system.n_quadratures(), 0.0);
  std::vector<double> g(system.n_quadratures());
  const double h = 1e-3;
  const double weights[] = {45.0 / 60.0, -9.0 / 60.0, 1.0 / 60.0};
  for (int k = 1; k <= 3; ++k) {
    for (const int sign : {1, -1}) {
      auto at = y;
      for (std::size_t i = 0; i < y.size(); ++i) at[i] += sign * k * h * v[i];
      core::evaluate_quadratures(system, at, g);
      for (std::size_t i = 0; i < g.size(); ++i) sum[i] += sign * weights[k - 1] * g[i] / h;
    }
  }
  for (std::size_t i = 0; i < g.size(); ++i) {
    EXPECT_NEAR(along[i], sum[i], 1e-9 * (std::abs(g[i]) + 1.0)) << "entry " << i;
  }
}

/// What the ledger counts is what the right-hand side does: at any state, for each conserved
/// quantity, in + made - out = d(stored)/dt.
TEST_P(EveryFlow, LedgerRatesAddUpToTheChangeOfWhatIsStored) {
  const auto loaded = load_text(every_flow_case(GetParam().first, GetParam().second, kRun));
  ASSERT_NE(loaded, nullptr);
  DigesterSystem system(loaded->the_case, loaded->balance, {});
  std::vector<double> y = uneven_state(loaded->the_case, system.layout());
  ASSERT_TRUE(system.make_consistent(y).ok());
  std::vector<double> f(y.size());
  std::vector<double> g(system.n_quadratures());
  using Entry = Ledger::Entry;
  for (const double t : {0.0, 0.1, 0.5}) {
    system.enter(t);
    core::evaluate_rates(system, y, f);
    core::evaluate_quadratures(system, y, g);
    for (const Conserved what : kConserved) {
      const double change = system.ledger().stored(what, f);  // linear in the state
      const double net = g[Ledger::at(what, Entry::inflow)] + g[Ledger::at(what, Entry::made)] -
                         g[Ledger::at(what, Entry::liquid_out)] -
                         g[Ledger::at(what, Entry::gas_out)];
      const double turnover = system.ledger().stored(what, y) * 200.0;  // per d, by gas transfer
      EXPECT_NEAR(change, net, 1e-13 * turnover + 1e-12) << static_cast<int>(what) << " at " << t;
    }
    EXPECT_NEAR(g[Ledger::kWaterIn], g[Ledger::kWaterOut], 1e-11);
  }
}

INSTANTIATE_TEST_SUITE_P(Models, EveryFlow,
                         ::testing::Values(std::pair(R"("adm1")", kSludge),
                                           std::pair(R"("first_order")",
                                                     R"({ "X_degradable": 30, "X_residue": 20 })"),
                                           std::pair(R"("two_step")", kTwoStepFeed),
                                           std::pair(R"("inert")", R"({ "S_tracer": 1 })")),
                         [](const auto& test) {
                           std::string name = test.param.first;
                           std::erase(name, '"');
                           return name;
                         });

TEST(DigesterSystem, MeanConditionsNeverSwitchAndFeedTheSameWaterPerDay) {
  const auto loaded = load_text(every_flow_case(R"("inert")", R"({ "S_tracer": 1 })", kRun));
  ASSERT_NE(loaded, nullptr);
  Operation mean(loaded->the_case, loaded->balance, Operation::Mode::mean);
  EXPECT_FALSE(mean.next_switch(0.0).has_value());
  Operation scheduled(loaded->the_case, loaded->balance, Operation::Mode::scheduled);
  const auto over_a_day = scheduled.mean_rates(0.0, 1.0);
  const auto rates = mean.at(0.0).rates;
  for (std::size_t s = 0; s < rates.size(); ++s) {
    EXPECT_NEAR(rates[s], over_a_day[s], 1e-9 * (1.0 + rates[s])) << "stream " << s;
  }
}

TEST(DigesterSystem, TheSameCombinationOfSwitchesIsTheSameKindOfInterval) {
  const auto loaded = load_text(every_flow_case(R"("inert")", R"({ "S_tracer": 1 })", kRun));
  ASSERT_NE(loaded, nullptr);
  DigesterSystem system(loaded->the_case, loaded->balance, {});
  std::vector<std::size_t> kinds;
  double t = 0.0;
  while (t < 2.0) {
    system.enter(t);
    kinds.push_back(system.interval_kind());
    t = system.next_switch(t).value_or(2.0);
  }
  EXPECT_GT(kinds.size(), 90U);  // mixing twice an hour, feed twice a day
  EXPECT_EQ(*std::ranges::max_element(kinds), 3U);
}

TEST(DigesterSystem, NamesItsUnknowns) {
  const auto loaded = load_text(every_flow_case(R"("adm1")", kSludge, kRun));
  ASSERT_NE(loaded, nullptr);
  const DigesterSystem system(loaded->the_case, loaded->balance, {});
  EXPECT_EQ(system.unknown_place(27), "zone core");
  EXPECT_EQ(system.unknown_quantity(26), "pH");
  EXPECT_EQ(system.unknown_place(system.n_unknowns() - 1), "headspace bell");
  EXPECT_EQ(system.unknown_quantity(system.n_unknowns() - 1), "S_gas_co2");
}

}  // namespace
}  // namespace stillzone::network
