#include "kinetics/zone_kinetics.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <complex>
#include <random>
#include <vector>

#include "core/require.hpp"
#include "kinetics/model_program.hpp"
#include "tests/unit/kinetics/allocation_count_support.hpp"
#include "tests/unit/kinetics/chemostat_support.hpp"

namespace stillzone::kinetics {
namespace {

/// Zones at random states and conditions; the first has no gas transfer.
struct Zones {
  explicit Zones(std::size_t n) {
    std::mt19937_64 random(n);
    const auto uniform = [&](double low, double high) {
      return std::uniform_real_distribution<double>(low, high)(random);
    };
    for (std::size_t z = 0; z < n; ++z) {
      conditions.push_back(
          {uniform(295.0, 330.0), z == 0 ? 0.0 : uniform(1.0, 200.0), uniform(295.0, 330.0)});
      const double carbon = uniform(0.02, 0.1);
      // Fewer cations than carbon: bicarbonate can balance them at some pH of the range.
      const std::array<double, 5> y{uniform(0.0, 1.0), uniform(0.1, 2.0), carbon,
                                    uniform(0.1, 0.95) * carbon, uniform(5.0, 8.5)};
      unknowns.insert(unknowns.end(), y.begin(), y.end());
      gases.push_back(uniform(0.0, 0.02));
    }
  }
  template <class Number>
  [[nodiscard]] std::array<Number, 6> row(std::size_t z) const {
    std::array<Number, 6> y{};
    for (std::size_t i = 0; i < 5; ++i) y[i] = unknowns[z * 5 + i];
    y[5] = gases[z];
    return y;
  }

  std::vector<ZoneConditions> conditions;
  std::vector<double> unknowns;
  std::vector<double> gases;
};

TEST(ZoneKinetics, RatesAreThoseOfTheFormulaByHand) {
  const KineticModel model = chemostat_model();
  for (const std::size_t n : {1U, 2U, 5U, 9U, 37U}) {
    const Zones zones(n);
    ZoneKinetics kinetics(model, zones.conditions);
    std::vector<double> source(n * 5);
    std::vector<double> transfer(n);
    kinetics.rates(zones.unknowns, zones.gases, source, transfer);
    for (std::size_t z = 0; z < n; ++z) {
      const auto expected = chemostat_by_hand(zones.row<double>(z), zones.conditions[z]);
      // Rounding; the charge balance and the transfer are differences of terms of about 0.05.
      for (std::size_t i = 0; i < 5; ++i) {
        EXPECT_NEAR(source[z * 5 + i], expected[i], 1e-12 * (1.0 + std::abs(expected[i])));
      }
      EXPECT_NEAR(transfer[z], expected[5], 1e-12 * (1.0 + std::abs(expected[5])));
    }
  }
}

TEST(ZoneKinetics, NoTransferWithoutGasExchange) {
  const KineticModel model = chemostat_model();
  const Zones zones(1);
  ZoneKinetics kinetics(model, zones.conditions);
  std::vector<double> source(5);
  std::vector<double> transfer(1);
  kinetics.rates(zones.unknowns, zones.gases, source, transfer);
  EXPECT_DOUBLE_EQ(transfer[0], 0.0);
}

// Im f(y + ih) / h has no cancellation (Squire and Trapp 1998).
TEST(ZoneKinetics, JacobianIsTheComplexStepOfTheFormulaByHand) {
  const KineticModel model = chemostat_model();
  for (const std::size_t n : {1U, 4U, 21U}) {
    const Zones zones(n);
    ZoneKinetics kinetics(model, zones.conditions);
    const auto pattern = kinetics.pattern();
    std::vector<double> values(n * pattern.size());
    kinetics.jacobian(zones.unknowns, zones.gases, values);
    for (std::size_t z = 0; z < n; ++z) {
      std::array<std::array<double, 6>, kChemostatRows> found{};
      for (std::size_t e = 0; e < pattern.size(); ++e) {
        found[pattern[e].row][pattern[e].column] = values[z * pattern.size() + e];
      }
      for (std::size_t column = 0; column < 6; ++column) {
        auto y = zones.row<std::complex<double>>(z);
        y[column] += std::complex<double>(0.0, 1e-40);
        const auto shifted = chemostat_by_hand(y, zones.conditions[z]);
        for (std::size_t row = 0; row < kChemostatRows; ++row) {
          const double expected = shifted[row].imag() / 1e-40;
          EXPECT_NEAR(found[row][column], expected, 1e-11 * (1.0 + std::abs(expected)))
              << "zone " << z << " row " << row << " column " << column;
        }
      }
    }
  }
}

TEST(ZoneKinetics, PatternHoldsEachPossibleEntryOnceAndInOrder) {
  const KineticModel model = chemostat_model();
  const ZoneKinetics kinetics(model, std::vector<ZoneConditions>(1));
  std::vector<std::pair<std::size_t, std::size_t>> entries;
  for (const KineticEntry& e : kinetics.pattern()) entries.emplace_back(e.row, e.column);
  // S and X: S, X, pH (X also its decay); C: S, X, C, pH, gas; cations: none; charge: C, cations,
  // pH; transfer: C, pH, gas.
  const std::vector<std::pair<std::size_t, std::size_t>> expected{
      {0, 0}, {0, 1}, {0, 4}, {1, 0}, {1, 1}, {1, 4}, {2, 0}, {2, 1}, {2, 2},
      {2, 4}, {2, 5}, {4, 2}, {4, 3}, {4, 4}, {5, 2}, {5, 4}, {5, 5}};
  EXPECT_EQ(entries, expected);
}

TEST(ZoneKinetics, JacobianIsFiniteAtAnEmptyZone) {
  const KineticModel model = chemostat_model();
  ZoneKinetics kinetics(model, std::vector<ZoneConditions>(1));
  const std::vector<double> unknowns{0.0, 0.0, 0.0, 0.0, 7.0};
  const std::vector<double> gases{0.0};
  std::vector<double> values(kinetics.pattern().size());
  kinetics.jacobian(unknowns, gases, values);
  for (const double value : values) EXPECT_TRUE(std::isfinite(value));
}

TEST(ZoneKinetics, NewConditionsReplaceTheOld) {
  const KineticModel model = chemostat_model();
  const Zones zones(6);
  ZoneKinetics changed(model, std::vector<ZoneConditions>(6));
  changed.set_conditions(zones.conditions);
  ZoneKinetics fresh(model, zones.conditions);
  std::vector<double> source_a(30), source_b(30), transfer_a(6), transfer_b(6);
  changed.rates(zones.unknowns, zones.gases, source_a, transfer_a);
  fresh.rates(zones.unknowns, zones.gases, source_b, transfer_b);
  EXPECT_EQ(source_a, source_b);
  EXPECT_EQ(transfer_a, transfer_b);
}

TEST(ZoneKinetics, ProcessRatesAndDerivedQuantitiesAreThoseOfTheModel) {
  const KineticModel model = chemostat_model();
  const Zones zones(3);
  ZoneKinetics kinetics(model, zones.conditions);
  ASSERT_EQ(kinetics.n_processes(), 2U);
  std::vector<double> rates(6), derived(6);
  kinetics.process_rates(zones.unknowns, zones.gases, rates);
  kinetics.derived(zones.unknowns, derived);
  for (std::size_t z = 0; z < 3; ++z) {
    const auto hand = chemostat_by_hand(zones.row<double>(z), zones.conditions[z]);
    EXPECT_NEAR(rates[2 * z], -hand[0] / 10.0, 1e-13);
    EXPECT_NEAR(rates[2 * z + 1], 0.02 * zones.unknowns[z * 5 + 1], 1e-13);
    EXPECT_NEAR(derived[2 * z] + derived[2 * z + 1], zones.unknowns[z * 5 + 2], 1e-13);
  }
}

TEST(ZoneKinetics, RatesAndJacobianAllocateNothing) {
  const KineticModel model = chemostat_model();
  const Zones zones(19);
  ZoneKinetics kinetics(model, zones.conditions);
  std::vector<double> source(19 * 5), transfer(19), values(19 * kinetics.pattern().size());
  const std::size_t before = n_allocations();
  kinetics.rates(zones.unknowns, zones.gases, source, transfer);
  kinetics.jacobian(zones.unknowns, zones.gases, values);
  kinetics.set_conditions(zones.conditions);
  EXPECT_EQ(n_allocations(), before);
}

TEST(ZoneKinetics, SolvesThePhOfEveryZoneToTheLastDigits) {
  const KineticModel model = chemostat_model();
  Zones zones(23);
  ZoneKinetics kinetics(model, zones.conditions);
  ASSERT_TRUE(kinetics.solve_implicits(zones.unknowns).ok());
  for (std::size_t z = 0; z < 23; ++z) {
    const auto residual = [&](double ph) {
      auto y = zones.row<double>(z);
      y[4] = ph;
      return chemostat_by_hand(y, zones.conditions[z])[4];
    };
    // The residual changes sign within a few units of the last place of pH.
    const double ph = zones.unknowns[z * 5 + 4];
    EXPECT_GE(residual(ph - 1e-13) * -residual(ph + 1e-13), 0.0) << ph;
  }
}

TEST(ZoneKinetics, RootDoesNotDependOnTheStart) {
  const KineticModel model = chemostat_model();
  const Zones zones(1);
  ZoneKinetics kinetics(model, zones.conditions);
  std::vector<double> roots;
  for (const double start : {2.0, 4.0, 7.0, 11.9, -3.0, std::nan("")}) {
    std::vector<double> unknowns = zones.unknowns;
    unknowns[4] = start;
    ASSERT_TRUE(kinetics.solve_implicits(unknowns).ok());
    roots.push_back(unknowns[4]);
  }
  for (const double root : roots) EXPECT_NEAR(root, roots[0], 5e-14);
}

TEST(ZoneKinetics, FailureOfAnImplicitEquationNamesZoneAndUnknown) {
  const KineticModel model = chemostat_model();
  Zones zones(3);
  zones.unknowns[1 * 5 + 3] = -5.0;  // more anions than any pH can balance
  ZoneKinetics kinetics(model, zones.conditions);
  const auto solved = kinetics.solve_implicits(zones.unknowns);
  ASSERT_FALSE(solved.ok());
  EXPECT_EQ(solved.failure().place, "zone number 2");
  EXPECT_EQ(solved.failure().quantity, "pH");
  EXPECT_NE(solved.failure().reason.find("pH has no root between 2 and 12"), std::string::npos)
      << solved.failure().reason;
}

TEST(ZoneKinetics, WrongSizesAreADefect) {
  const KineticModel model = chemostat_model();
  ZoneKinetics kinetics(model, std::vector<ZoneConditions>(2));
  std::vector<double> five(5), ten(10), one(1), two(2);
  EXPECT_THROW(kinetics.rates(five, two, ten, two), core::ProgramDefect);
  EXPECT_THROW(kinetics.rates(ten, one, ten, two), core::ProgramDefect);
  EXPECT_THROW(kinetics.jacobian(ten, two, five), core::ProgramDefect);
  EXPECT_THROW(kinetics.set_conditions(std::vector<ZoneConditions>(3)), core::ProgramDefect);
}

}  // namespace
}  // namespace stillzone::kinetics
