#include "cli/report/svg_chart.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <set>

namespace stillzone::cli {
namespace {

using ::testing::DoubleNear;
using ::testing::ElementsAre;
using ::testing::HasSubstr;
using ::testing::Not;

TEST(Ticks, StandAtRoundNumbersInsideTheRange) {
  EXPECT_THAT(nice_ticks(0.0, 60.0, 6), ElementsAre(0, 10, 20, 30, 40, 50, 60));
  EXPECT_THAT(nice_ticks(7.02, 7.11, 5),
              ElementsAre(DoubleNear(7.02, 1e-12), DoubleNear(7.04, 1e-12), DoubleNear(7.06, 1e-12),
                          DoubleNear(7.08, 1e-12), DoubleNear(7.10, 1e-12)));
}

TEST(Ticks, ReachAcrossZero) {
  EXPECT_THAT(nice_ticks(-10.0, 10.0, 4), ElementsAre(-10, -5, 0, 5, 10));
}

TEST(Ticks, OfALogarithmicAxisArePowersOfTen) {
  EXPECT_THAT(log_ticks(0.01, 100.0),
              ElementsAre(DoubleNear(0.01, 1e-12), DoubleNear(0.1, 1e-12), 1, 10, 100));
  EXPECT_THAT(log_ticks(1.0, 10.0), ElementsAre(1, 2, 5, 10));
}

TEST(Styles, OfFortyCurvesAllDiffer) {
  std::set<std::string> seen;
  for (std::size_t i = 0; i < 40; ++i) seen.insert(style_classes(i));
  EXPECT_EQ(seen.size(), 40U);
}

Chart two_curves() {
  Chart chart;
  chart.title = "VFA of \"a\" & <b>";
  chart.x = {.title = "time", .unit = "d", .logarithmic = false, .low = {}, .high = {}};
  chart.y = {.title = "VFA", .unit = "kg/m3", .logarithmic = false, .low = 0.0, .high = 10.0};
  chart.series.resize(2);
  chart.series[0].name = "core";
  chart.series[0].points = {{0, 0}, {1, 10}, {2, 5}};
  chart.series[1].name = "rim";
  chart.series[1].style = 1;
  chart.series[1].points = {{0, 2}, {2, 2}};
  return chart;
}

TEST(SvgChart, WritesCurvesAsTenthsFromTheTopLeftRelativeAfterTheFirst) {
  // The plot is 220 high: y = 0 lies at 2200 tenths, y = 10 at 0, y = 5 at 1100.
  const std::string svg = svg_of(two_curves());
  EXPECT_THAT(svg, HasSubstr("data-name=\"core\" d=\"M0 2200l"));
  EXPECT_THAT(svg, HasSubstr(" -2200 "));
  EXPECT_THAT(svg, HasSubstr(" 1100\""));
}

TEST(SvgChart, EscapesNamesAndCarriesAlternativeText) {
  const std::string svg = svg_of(two_curves());
  EXPECT_THAT(svg, HasSubstr("<title>VFA of &quot;a&quot; &amp; &lt;b&gt;</title>"));
  EXPECT_THAT(svg, HasSubstr("core: from 0 to 10.00, last 5.000."));
  EXPECT_THAT(svg, HasSubstr("VFA [kg/m3]"));
  EXPECT_THAT(svg, Not(HasSubstr("<b>")));
}

TEST(SvgChart, DrawsErrorBarsAndBands) {
  Chart chart = two_curves();
  chart.series[0].kind = ChartSeries::Kind::points;
  chart.series[0].low = {0, 9, 4};
  chart.series[0].high = {1, 10, 6};
  chart.series[1].kind = ChartSeries::Kind::band;
  chart.series[1].low = {1, 1};
  chart.series[1].high = {3, 3};
  const std::string svg = svg_of(chart);
  EXPECT_THAT(svg, HasSubstr("class=\"band f1\""));
  EXPECT_THAT(svg, HasSubstr("m-4 0h8"));
  EXPECT_THAT(csv_of(chart), HasSubstr("core,1,10,9,10\r\n"));
}

TEST(SvgChart, StandsAConstantCurveAndAnEmptyOne) {
  Chart chart = two_curves();
  chart.y.low = chart.y.high = std::nullopt;
  chart.series[0].points = {{1, 3}};
  chart.series[1].points.clear();
  const std::string svg = svg_of(chart);
  EXPECT_THAT(svg, Not(HasSubstr("nan")));
  EXPECT_THAT(svg, Not(HasSubstr("inf")));
}

TEST(SvgChart, LeavesValuesOutThatALogarithmicAxisCannotShow) {
  Chart chart = two_curves();
  chart.y = {.title = "rate", .unit = "1/d", .logarithmic = true, .low = {}, .high = {}};
  const std::string svg = svg_of(chart);
  EXPECT_THAT(svg, Not(HasSubstr("nan")));
  EXPECT_THAT(svg, Not(HasSubstr("inf")));
}

}  // namespace
}  // namespace stillzone::cli
