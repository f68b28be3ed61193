#include "network/gas_meter.hpp"

#include <gtest/gtest.h>

#include "tests/case_runner.hpp"

namespace stillzone::testing {
namespace {

using network::RunResult;

const network::Balance& balance_of(const RunResult& result, const std::string& name) {
  for (const auto& balance : result.balances) {
    if (balance.name == name) return balance;
  }
  throw std::runtime_error("no balance " + name);
}

/// Methane and hydrogen are all the COD in the gas; hydrogen is some millionths of it. One kmol of
/// methane is 64 kg COD and, with the model's gas constant, R 273.15 / 1.01325 m3.
TEST(GasMeter, OfPulsedOperationCountsTheMethaneThatTheLedgerLosesToTheGas) {
  auto loaded = load_file(STILLZONE_SOURCE_DIR "/cases/pulse_feeding.json");
  ASSERT_NE(loaded, nullptr);
  loaded->the_case.run.until = core::Duration(4.0);
  const RunResult result = run(*loaded);
  ASSERT_EQ(result.headspaces.size(), 1U);
  const double normal_per_kmol = loaded->the_case.kinetics.gas_constant * 273.15 / 1.01325;
  const double methane_cod =
      4.0 * result.headspaces[0].mean_methane_flow_normal / normal_per_kmol * 64.0;
  const double gas_cod = balance_of(result, "COD").gas_out;
  EXPECT_LE(methane_cod, gas_cod);
  EXPECT_NEAR(methane_cod, gas_cod, 1e-3 * gas_cod);
  EXPECT_GT(result.headspaces[0].mean_gas_flow_normal_dry,
            result.headspaces[0].mean_methane_flow_normal);
  EXPECT_GT(result.headspaces[0].mean_gas_flow, result.headspaces[0].mean_gas_flow_normal_dry);
}

TEST(GasMeter, OfASteadyStateReadsTheSteadyFlows) {
  const auto loaded = load_file(STILLZONE_SOURCE_DIR "/cases/ideal_tank.json");
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  const auto& gas = result.headspaces.at(0);
  EXPECT_NEAR(gas.mean_gas_flow, gas.gas_flow, 1e-9 * gas.gas_flow);
  EXPECT_NEAR(gas.mean_gas_flow_normal_dry, gas.gas_flow_normal_dry, 1e-9 * gas.gas_flow);
  EXPECT_NEAR(gas.mean_methane_flow_normal, gas.methane_flow_normal, 1e-9 * gas.gas_flow);
}

}  // namespace
}  // namespace stillzone::testing
