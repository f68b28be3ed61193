// Second-order conversion between total segregation and maximum mixedness for N equal tanks: check
// value RTD-27, 15 cases in data/rtd_analytic.json. Source: Zwietering (1959), Chem. Eng. Sci.
// 11:1-15; numbers by SciPy (for N = 1 maximum mixedness is the mixed tank itself).
#include <gtest/gtest.h>

#include <fstream>
#include <nlohmann/json.hpp>

#include "network/tracer/model_conversion.hpp"

namespace stillzone::network {
namespace {

TEST(SecondOrderBounds, EqualTanksInSeries) {  // 1e-8
  std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/rtd_analytic.json");
  const auto cases = nlohmann::json::parse(file)["second_order_bounds"]["cases"];
  ASSERT_EQ(cases.size(), 15U);
  const auto model = make_rtd_model("tanks_in_series", core::Volume(1.0), core::FlowRate(1.0));
  for (const auto& wanted : cases) {
    const std::vector<double> p = {1.0, wanted["N"].get<double>()};
    const double k = wanted["K"];
    EXPECT_NEAR(second_order_segregated(*model, p, k, 1e-10), wanted["c_segregated"].get<double>(),
                1e-8)
        << wanted;
    EXPECT_NEAR(second_order_maximum_mixedness(*model, p, k, 1e-10),
                wanted["c_maxmixed"].get<double>(), 1e-8)
        << wanted;
  }
}

TEST(SecondOrderBounds, BypassLeavesAsItCame) {
  // A share b past a mixed tank: at maximum mixedness b + (1-b) c of the tank, c by the quadratic.
  const auto model = make_rtd_model("bypass_dead", core::Volume(1.0), core::FlowRate(1.0));
  const double b = 0.2;
  const double k = 3.0;
  const double tau = 1.0 / (1.0 - b);  // of the tank, mixed volume 1
  const double tank = (std::sqrt(1.0 + 4.0 * k * tau) - 1.0) / (2.0 * k * tau);
  EXPECT_NEAR(second_order_maximum_mixedness(*model, std::vector{1.0, b}, k, 1e-10),
              b + (1.0 - b) * tank, 1e-8);
}

}  // namespace
}  // namespace stillzone::network
