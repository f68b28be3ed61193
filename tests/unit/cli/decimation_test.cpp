#include "cli/report/decimation.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace stillzone::cli {
namespace {

std::vector<double> counting(std::size_t n) {
  std::vector<double> x(n);
  for (std::size_t i = 0; i < n; ++i) x[i] = static_cast<double>(i);
  return x;
}

TEST(Decimation, ReturnsAShortHistoryUnchanged) {
  const auto x = counting(40);
  const auto points = decimated(x, x, 10);
  ASSERT_EQ(points.size(), 40U);
  EXPECT_DOUBLE_EQ(points[17].y, 17.0);
}

TEST(Decimation, KeepsASingleSpikeOfALongHistory) {
  const auto x = counting(100000);
  std::vector<double> y(x.size(), 1.0);
  y[54321] = 9.0;
  y[777] = -4.0;
  const auto points = decimated(x, y, 100);
  EXPECT_LE(points.size(), 400U);
  const auto at = [&](double t) {
    return std::find_if(points.begin(), points.end(),
                        [&](const auto& p) { return std::fabs(p.x - t) < 0.5; });
  };
  ASSERT_NE(at(54321.0), points.end());
  EXPECT_DOUBLE_EQ(at(54321.0)->y, 9.0);
  ASSERT_NE(at(777.0), points.end());
  EXPECT_DOUBLE_EQ(at(777.0)->y, -4.0);
}

TEST(Decimation, KeepsFirstAndLastAndTheOrderOfTime) {
  const auto x = counting(9999);
  std::vector<double> y;
  for (const double t : x) y.push_back(std::sin(t));
  const auto points = decimated(x, y, 50);
  EXPECT_DOUBLE_EQ(points.front().x, 0.0);
  EXPECT_DOUBLE_EQ(points.back().x, 9998.0);
  for (std::size_t i = 1; i < points.size(); ++i) EXPECT_GT(points[i].x, points[i - 1].x);
}

TEST(Decimation, LeavesOutWhatIsNotFinite) {
  const std::vector<double> x = {0, 1, 2};
  const std::vector<double> y = {1, std::numeric_limits<double>::quiet_NaN(), 3};
  EXPECT_EQ(decimated(x, y, 10).size(), 2U);
}

}  // namespace
}  // namespace stillzone::cli
