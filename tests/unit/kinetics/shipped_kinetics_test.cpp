// Every shipped model through the tapes, against its own expressions evaluated with complex
// numbers.
#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <random>
#include <vector>

#include "kinetics/zone_kinetics.hpp"
#include "tests/unit/kinetics/allocation_count_support.hpp"
#include "tests/unit/kinetics/models_support.hpp"
#include "tests/unit/kinetics/random_expressions_support.hpp"

namespace stillzone::kinetics {
namespace {

/// Zones around the model's inoculum, at different temperatures and gas transfers.
struct Zones {
  Zones(const KineticModel& model, std::size_t n) {
    std::mt19937_64 random(42);
    const auto uniform = [&](double low, double high) {
      return std::uniform_real_distribution<double>(low, high)(random);
    };
    for (std::size_t z = 0; z < n; ++z) {
      conditions.push_back({uniform(298.0, 328.0), uniform(0.0, 200.0), uniform(298.0, 328.0)});
      for (const Component& c : model.components) {
        unknowns.push_back((c.seed + c.floor) * uniform(0.5, 2.0));
      }
      for (const Implicit& i : model.implicits) unknowns.push_back(i.start + uniform(-0.6, 0.6));
      for (const Gas& g : model.gases) gases.push_back((g.seed + g.floor) * uniform(0.5, 2.0));
    }
  }
  /// Inputs of the model's program.
  [[nodiscard]] std::vector<double> inputs(const KineticModel& model, std::size_t z) const {
    const std::size_t n = model.n_zone_unknowns();
    const std::size_t n_gases = model.gases.size();
    std::vector<double> all(unknowns.begin() + static_cast<std::ptrdiff_t>(z * n),
                            unknowns.begin() + static_cast<std::ptrdiff_t>((z + 1) * n));
    all.insert(all.end(), gases.begin() + static_cast<std::ptrdiff_t>(z * n_gases),
               gases.begin() + static_cast<std::ptrdiff_t>((z + 1) * n_gases));
    all.insert(all.end(), {conditions[z].temperature, conditions[z].gas_transfer,
                           conditions[z].gas_temperature});
    return all;
  }
  std::vector<ZoneConditions> conditions;
  std::vector<double> unknowns;
  std::vector<double> gases;
};

std::vector<NodeId> rows_of(const KineticModel& model) {
  std::vector<NodeId> rows = model.program->source;
  rows.insert(rows.end(), model.program->implicit.begin(), model.program->implicit.end());
  rows.insert(rows.end(), model.program->transfer.begin(), model.program->transfer.end());
  return rows;
}

class ShippedKinetics : public ::testing::TestWithParam<std::string> {
 protected:
  static constexpr std::size_t kZones = 7;
  KineticModel model = test::shipped(GetParam());
  Zones zones{model, kZones};
  ZoneKinetics kinetics{model, zones.conditions};
};

TEST_P(ShippedKinetics, RatesAreThoseOfTheModelsExpressions) {
  const std::size_t n = model.n_zone_unknowns();
  const std::size_t n_gases = model.gases.size();
  std::vector<double> source(kZones * n), transfer(kZones * n_gases);
  kinetics.rates(zones.unknowns, zones.gases, source, transfer);
  const std::vector<NodeId> rows = rows_of(model);
  for (std::size_t z = 0; z < kZones; ++z) {
    const std::vector<double> at = zones.inputs(model, z);
    for (std::size_t row = 0; row < rows.size(); ++row) {
      const double expected = model.program->graph.evaluate(rows[row], at);
      const double found = row < n ? source[z * n + row] : transfer[z * n_gases + row - n];
      // Rounding: sums of terms up to about 100 units/m3/d.
      EXPECT_NEAR(found, expected, 1e-12 * (1.0 + std::abs(expected))) << z << " " << row;
    }
  }
}

TEST_P(ShippedKinetics, JacobianIsTheComplexStepAndThePatternIsComplete) {
  const auto pattern = kinetics.pattern();
  std::vector<double> values(kZones * pattern.size());
  kinetics.jacobian(zones.unknowns, zones.gases, values);
  const std::vector<NodeId> rows = rows_of(model);
  const std::size_t n_columns = model.program->input_temperature();
  for (std::size_t z = 0; z < kZones; ++z) {
    std::vector<double> found(rows.size() * n_columns, 0.0);
    for (std::size_t e = 0; e < pattern.size(); ++e) {
      found[pattern[e].row * n_columns + pattern[e].column] = values[z * pattern.size() + e];
    }
    const std::vector<double> at = zones.inputs(model, z);
    for (std::size_t column = 0; column < n_columns; ++column) {
      std::vector<std::complex<double>> shifted(at.begin(), at.end());
      shifted[column] += std::complex<double>(0.0, 1e-40);
      for (std::size_t row = 0; row < rows.size(); ++row) {
        const double expected =
            complex_value(model.program->graph, rows[row], shifted).imag() / 1e-40;
        const double value = found[row * n_columns + column];
        EXPECT_NEAR(value, expected, 1e-11 * (1.0 + std::abs(expected)))
            << "zone " << z << " row " << row << " column " << column;
      }
    }
  }
}

TEST_P(ShippedKinetics, RatesAndJacobianAllocateNothing) {
  std::vector<double> source(zones.unknowns.size()), transfer(zones.gases.size());
  std::vector<double> values(kZones * kinetics.pattern().size());
  const std::size_t before = n_allocations();
  kinetics.rates(zones.unknowns, zones.gases, source, transfer);
  kinetics.jacobian(zones.unknowns, zones.gases, values);
  EXPECT_EQ(n_allocations(), before);
}

TEST_P(ShippedKinetics, ImplicitEquationsAreSolvedToRounding) {
  for (std::size_t z = 0; z < kZones; ++z) {
    for (std::size_t i = 0; i < model.components.size(); ++i) {
      zones.unknowns[z * model.n_zone_unknowns() + i] = model.components[i].seed;
    }
  }
  ASSERT_TRUE(kinetics.solve_implicits(zones.unknowns).ok());
  for (std::size_t z = 0; z < kZones; ++z) {
    const std::vector<double> at = zones.inputs(model, z);
    for (const NodeId equation : model.program->implicit) {
      // Charges of up to 0.2 kmol/m3 cancel.
      EXPECT_NEAR(model.program->graph.evaluate(equation, at), 0.0, 1e-15);
    }
  }
}

INSTANTIATE_TEST_SUITE_P(Every, ShippedKinetics, ::testing::ValuesIn(shipped_models()),
                         [](const auto& name) { return name.param; });

}  // namespace
}  // namespace stillzone::kinetics
