#pragma once

#include <optional>
#include <string>
#include <vector>

#include "cli/report/decimation.hpp"

namespace stillzone::cli {

/// Ticks at round numbers (1, 2, 2.5 or 5 times a power of ten) that cover [low, high]; the first
/// and the last lie on or inside the range.
/// @param low < high, both finite; @param most >= 2, about how many
[[nodiscard]] std::vector<double> nice_ticks(double low, double high, int most);
/// Powers of ten in [low, high], with 2 and 5 times them when there are fewer than three.
/// @param low > 0
[[nodiscard]] std::vector<double> log_ticks(double low, double high);

/// One curve, one set of points, or one band of a chart.
struct ChartSeries {
  enum class Kind { line, points, band };
  std::string name;
  Kind kind = Kind::line;
  std::vector<ChartPoint> points;  ///< of a line, x rising
  std::vector<double> low;         ///< error bars or the lower edge of a band; empty: none
  std::vector<double> high;        ///< same size as points, as `low`
  std::size_t style = 0;           ///< colour, dash and marker go by this number
  bool bare = false;               ///< a line without markers, told from others by its dash
  bool upper_limits = false;       ///< points known only to lie lower: marker turned down
};

struct ChartAxis {
  std::string title;  ///< "time"
  std::string unit;   ///< "d"; empty: none
  bool logarithmic = false;
  std::optional<double> low;  ///< otherwise what the series need
  std::optional<double> high;
};

/// An upright line with a word to it: "today", "start of mixing".
struct ChartMark {
  double x = 0.0;
  std::string label;
};

struct Chart {
  std::string title;  ///< also the first part of the alternative text
  ChartAxis x;
  ChartAxis y;
  std::vector<ChartSeries> series;
  std::vector<ChartMark> marks;
  bool zoom = false;  ///< drag to zoom along x, with the page's script
};

/// The chart as an <svg> element, 560 wide and 300 high (more with a long legend) in its own units.
/// Every curve differs from its neighbours by colour, by dash and by marker. Carries <title> and
/// <desc> as alternative text, and what the page's script needs for hover values.
[[nodiscard]] std::string svg_of(const Chart& chart);

/// Class names "k0".."k7" (colour) and "d0".."d4" (dash) of a style number.
[[nodiscard]] std::string style_classes(std::size_t style);

/// The numbers of a chart as CSV, one line per point: series, x, y (and low, high where given).
[[nodiscard]] std::string csv_of(const Chart& chart);

}  // namespace stillzone::cli
