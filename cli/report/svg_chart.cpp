#include "cli/report/svg_chart.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "cli/report/page.hpp"

namespace stillzone::cli {

namespace {

constexpr double kWidth = 560.0;
constexpr double kPlotHeight = 220.0;
constexpr double kTop = 30.0;     // room for the title of the y axis
constexpr double kLetter = 10.0;  // widest mean letter at the narrow-screen size
constexpr double kLegendRow = 23.0;

/// Maps values of one axis to drawing units.
struct Scale {
  double low = 0.0;
  double high = 1.0;
  bool logarithmic = false;
  double from = 0.0;  ///< drawing unit of `low`
  double to = 1.0;

  [[nodiscard]] double at(double value) const {
    const double share =
        logarithmic ? std::log(value / low) / std::log(high / low) : (value - low) / (high - low);
    return from + share * (to - from);
  }
  [[nodiscard]] bool takes(double value) const {
    return std::isfinite(value) && (!logarithmic || value > 0.0);
  }
};

/// Range of the data along one axis, widened where it has no width.
Scale range_of(const std::vector<double>& values, const ChartAxis& axis, bool widen) {
  Scale scale{.logarithmic = axis.logarithmic};
  bool any = false;
  for (const double v : values) {
    if (!scale.takes(v)) continue;
    scale.low = any ? std::min(scale.low, v) : v;
    scale.high = any ? std::max(scale.high, v) : v;
    any = true;
  }
  if (!any) scale.low = scale.high = 1.0;
  if (axis.low) scale.low = *axis.low;
  if (axis.high) scale.high = *axis.high;
  if (axis.logarithmic) {
    if (!(scale.high > scale.low * 1.0001)) {
      scale.low /= 2.0;
      scale.high *= 2.0;
    }
    return scale;
  }
  // A range within rounding of one value would only draw noise.
  const double size = std::max(std::fabs(scale.low), std::fabs(scale.high));
  const double least = std::max(1e-12, 1e-3 * size);
  if (scale.high - scale.low < least) {
    const double middle = 0.5 * (scale.high + scale.low);
    scale.low = middle - least;
    scale.high = middle + least;
  }
  if (!widen) return scale;
  const double margin = 0.05 * (scale.high - scale.low);
  if (!axis.low) scale.low = scale.low >= 0.0 && scale.low < margin * 4 ? 0.0 : scale.low - margin;
  if (!axis.high) scale.high += margin;
  return scale;
}

std::vector<double> values_of(const Chart& chart, bool along_x) {
  std::vector<double> values;
  for (const ChartSeries& series : chart.series) {
    for (const ChartPoint& point : series.points) values.push_back(along_x ? point.x : point.y);
    if (along_x) continue;
    values.insert(values.end(), series.low.begin(), series.low.end());
    values.insert(values.end(), series.high.begin(), series.high.end());
  }
  if (along_x) {
    for (const ChartMark& mark : chart.marks) values.push_back(mark.x);
  }
  return values;
}

/// Labels of the ticks, all with as many decimals as their step needs.
std::vector<std::string> labels_of(const std::vector<double>& ticks, bool logarithmic) {
  std::vector<std::string> labels;
  double step = ticks.size() > 1 ? ticks[1] - ticks[0] : 1.0;
  double size = 0.0;
  for (const double t : ticks) size = std::max(size, std::fabs(t));
  int decimals = std::max(0, -static_cast<int>(std::floor(std::log10(step) + 1e-9)));
  if (std::fabs(step * std::pow(10.0, decimals) - std::round(step * std::pow(10.0, decimals))) >
      1e-6) {
    ++decimals;  // 2.5 of a power of ten
  }
  for (const double t : ticks) {
    if (logarithmic) {
      labels.push_back(fmt::format("{:g}", t));
    } else if (size >= 1e6 || (size < 1e-3 && size > 0.0)) {
      labels.push_back(fmt::format("{:.3g}", t));
    } else {
      const double clean = std::fabs(t) < 1e-9 * step ? 0.0 : t;
      labels.push_back(fmt::format("{:.{}f}", clean, decimals));
    }
  }
  return labels;
}

std::string title_of(const ChartAxis& axis) {
  return axis.unit.empty() ? axis.title : axis.title + " [" + axis.unit + "]";
}

/// A marker of the style's shape around (x, y).
std::string marker(double x, double y, std::size_t style) {
  static constexpr std::array<const char*, 5> kShapes = {"m-4 0a4 4 0 1 0 8 0a4 4 0 1 0-8 0z",
                                                         "m-4-4h8v8h-8z", "m0-5l5 9h-10z",
                                                         "m0-5l5 5-5 5-5-5z", "m-4-4l8 8m0-8l-8 8"};
  return fmt::format("<path class=\"mk k{}\" d=\"M{:.1f} {:.1f}{}\"/>", style % 8, x, y,
                     kShapes[style % kShapes.size()]);
}

std::string marker_of(const ChartSeries& series, double x, double y) {
  if (!series.upper_limits) return marker(x, y, series.style);
  return fmt::format("<path class=\"mk k{}\" d=\"M{:.1f} {:.1f}m0 5l5-9h-10z\"/>", series.style % 8,
                     x, y);
}

/// Draws one chart; the members are what all its parts share.
class ChartDrawing {
 public:
  explicit ChartDrawing(const Chart& chart) : chart_(chart) {
    x_ = range_of(values_of(chart, true), chart.x, false);
    y_ = range_of(values_of(chart, false), chart.y, true);
    y_ticks_ = y_.logarithmic ? log_ticks(y_.low, y_.high) : nice_ticks(y_.low, y_.high, 5);
    x_ticks_ = x_.logarithmic ? log_ticks(x_.low, x_.high) : nice_ticks(x_.low, x_.high, 6);
    y_labels_ = labels_of(y_ticks_, y_.logarithmic);
    std::size_t longest = 2;
    for (const std::string& label : y_labels_) longest = std::max(longest, label.size());
    left_ = 12.0 + kLetter * static_cast<double>(longest);
    right_ = kWidth - 16.0;
    x_.from = left_;
    x_.to = right_;
    y_.from = kTop + kPlotHeight;
    y_.to = kTop;
  }

  std::string svg() {
    std::string parts = grid() + curves() + marks();
    std::string key = legend();
    const double height = kTop + kPlotHeight + 52.0 + legend_height_;
    std::string svg = fmt::format(
        "<svg class=\"live\" viewBox=\"0 0 {} {:.0f}\" role=\"img\" data-plot=\"{:.1f} {} {:.1f} "
        "{}\" data-x=\"{:.9g} {:.9g} {}\" data-y=\"{:.9g} {:.9g} {}\" data-xname=\"{}\"{}>",
        kWidth, height, left_, kTop, right_ - left_, kPlotHeight, x_.low, x_.high,
        x_.logarithmic ? 1 : 0, y_.low, y_.high, y_.logarithmic ? 1 : 0,
        html_escaped(title_of(chart_.x)), chart_.zoom ? " data-zoom" : "");
    svg += fmt::format("<title>{}</title><desc>{}</desc>", html_escaped(chart_.title),
                       html_escaped(in_words()));
    return svg + parts + key + "</svg>";
  }

 private:
  /// The alternative text: what is drawn, between which values.
  [[nodiscard]] std::string in_words() const {
    std::string words = fmt::format("{} against {}.", title_of(chart_.y), title_of(chart_.x));
    for (const ChartSeries& series : chart_.series) {
      if (series.points.empty()) continue;
      const auto [low, high] =
          std::minmax_element(series.points.begin(), series.points.end(),
                              [](const auto& a, const auto& b) { return a.y < b.y; });
      words += fmt::format(" {}: from {} to {}, last {}.", series.name, shown(low->y),
                           shown(high->y), shown(series.points.back().y));
    }
    return words;
  }

  [[nodiscard]] std::string grid() const {
    std::string svg = "<path class=\"grid\" d=\"";
    for (const double t : y_ticks_)
      svg += fmt::format("M{:.1f} {:.1f}H{:.1f}", left_, y_.at(t), right_);
    svg += fmt::format("\"/><path class=\"axis\" d=\"M{0:.1f} {1}V{2}H{3:.1f}", left_, kTop,
                       kTop + kPlotHeight, right_);
    for (const double t : x_ticks_)
      svg += fmt::format("M{:.1f} {}v5", x_.at(t), kTop + kPlotHeight);
    svg += "\"/>";
    for (std::size_t i = 0; i < y_ticks_.size(); ++i) {
      svg += fmt::format("<text class=\"e q\" x=\"{:.1f}\" y=\"{:.1f}\">{}</text>", left_ - 6.0,
                         y_.at(y_ticks_[i]) + 5.0, y_labels_[i]);
    }
    const auto x_labels = labels_of(x_ticks_, x_.logarithmic);
    for (std::size_t i = 0; i < x_ticks_.size(); ++i) {
      const double x = x_.at(x_ticks_[i]);
      const char* anchor = x > right_ - 12.0 ? "e" : "c";
      svg +=
          fmt::format("<text class=\"{} q xt\" x=\"{:.1f}\" y=\"{}\">{}</text>", anchor,
                      anchor[0] == 'e' ? right_ + 8.0 : x, kTop + kPlotHeight + 20.0, x_labels[i]);
    }
    svg += fmt::format("<text class=\"b\" x=\"4\" y=\"16\">{}</text>",
                       html_escaped(title_of(chart_.y)));
    return svg + fmt::format("<text class=\"b e\" x=\"{:.1f}\" y=\"{}\">{}</text>", right_,
                             kTop + kPlotHeight + 42.0, html_escaped(title_of(chart_.x)));
  }

  /// Whole tenths of a drawing unit inside the plot, relative after the first point.
  [[nodiscard]] std::string path_of(const std::vector<ChartPoint>& points) const {
    std::string path;
    long px = 0;
    long py = 0;
    for (const ChartPoint& point : points) {
      if (!x_.takes(point.x) || !y_.takes(point.y)) continue;
      const long x = std::lround(10.0 * (x_.at(point.x) - left_));
      const long y = std::lround(10.0 * (y_.at(point.y) - kTop));
      if (path.empty()) {
        path = fmt::format("M{} {}", x, y);
      } else {
        path += fmt::format("{}{} {}", first_step_ ? "l" : " ", x - px, y - py);
        first_step_ = false;
      }
      px = x;
      py = y;
    }
    first_step_ = true;
    return path;
  }

  [[nodiscard]] std::string curves() const {
    std::string svg = fmt::format(
        "<svg x=\"{0:.1f}\" y=\"{1}\" width=\"{2:.1f}\" height=\"{3}\" viewBox=\"0 0 {4:.0f} "
        "{5:.0f}\" preserveAspectRatio=\"none\">",
        left_, kTop, right_ - left_, kPlotHeight, 10.0 * (right_ - left_), 10.0 * kPlotHeight);
    for (const ChartSeries& series : chart_.series) {
      if (series.kind == ChartSeries::Kind::band) svg += band(series);
    }
    for (const ChartSeries& series : chart_.series) {
      if (series.kind == ChartSeries::Kind::band || series.points.empty()) continue;
      const std::string path = path_of(series.points);
      if (path.empty()) continue;
      const bool line = series.kind == ChartSeries::Kind::line;
      svg += fmt::format("<path class=\"s {}\"{} data-name=\"{}\" d=\"{}\"/>",
                         style_classes(series.style), line ? "" : " style=\"stroke:none\"",
                         html_escaped(series.name), path);
    }
    svg += "</svg>";
    for (const ChartSeries& series : chart_.series) svg += markers(series);
    return svg;
  }

  [[nodiscard]] std::string band(const ChartSeries& series) const {
    std::vector<ChartPoint> edge;
    const std::size_t n = std::min({series.points.size(), series.low.size(), series.high.size()});
    for (std::size_t i = 0; i < n; ++i) edge.push_back({series.points[i].x, series.high[i]});
    for (std::size_t i = n; i-- > 0;) edge.push_back({series.points[i].x, series.low[i]});
    return fmt::format("<path class=\"band f{}\" d=\"{}z\"/>", series.style % 8, path_of(edge));
  }

  /// Every point of a set of points; a few along a line, to tell it from others in grey.
  [[nodiscard]] std::string markers(const ChartSeries& series) const {
    if (series.kind == ChartSeries::Kind::band || series.points.empty()) return "";
    std::string svg;
    if (series.kind == ChartSeries::Kind::points) {
      for (std::size_t i = 0; i < series.points.size(); ++i) svg += point(series, i);
      return svg;
    }
    if (chart_.series.size() < 2 || series.bare) return "";
    const double shift = static_cast<double>(series.style % 7) / 7.0;
    for (int m = 0; m < 5; ++m) {
      const double goal = x_.low + (x_.high - x_.low) * (m + 0.15 + 0.8 * shift) / 5.0;
      const auto next = std::lower_bound(series.points.begin(), series.points.end(), goal,
                                         [](const ChartPoint& p, double x) { return p.x < x; });
      if (next == series.points.end() || !y_.takes(next->y) || !x_.takes(next->x)) continue;
      svg += marker(x_.at(next->x), y_.at(next->y), series.style);
    }
    return svg;
  }

  [[nodiscard]] std::string point(const ChartSeries& series, std::size_t i) const {
    const ChartPoint& p = series.points[i];
    if (!x_.takes(p.x) || !y_.takes(p.y)) return "";
    std::string svg;
    const double x = x_.at(p.x);
    if (i < series.low.size() && i < series.high.size() && y_.takes(series.low[i])) {
      svg =
          fmt::format("<path class=\"mk k{}\" d=\"M{:.1f} {:.1f}V{:.1f}m-4 0h8M{:.1f} {:.1f}h8\"/>",
                      series.style % 8, x, y_.at(series.low[i]), y_.at(series.high[i]), x - 4.0,
                      y_.at(series.low[i]));
    }
    return svg + marker_of(series, x, y_.at(p.y));
  }

  [[nodiscard]] std::string marks() const {
    std::string svg;
    double line = 14.0;
    for (const ChartMark& mark : chart_.marks) {
      const double x = x_.at(mark.x);
      const bool turn = x > 0.5 * (left_ + right_);
      svg += fmt::format(
          "<path class=\"cursor\" d=\"M{0:.1f} {1}v{2}\"/><text class=\"halo{3}\" "
          "x=\"{4:.1f}\" y=\"{5:.1f}\">{6}</text>",
          x, kTop, kPlotHeight, turn ? " e" : "", turn ? x - 5.0 : x + 5.0, kTop + line,
          html_escaped(mark.label));
      line += 19.0;
    }
    return svg;
  }

  std::string legend() {
    if (chart_.series.size() < 2) return "";
    std::string svg;
    double x = 8.0;
    double y = kTop + kPlotHeight + 64.0;
    for (const ChartSeries& series : chart_.series) {
      const double width = 62.0 + kLetter * static_cast<double>(series.name.size());
      if (x + width > kWidth && x > 8.0) {
        x = 8.0;
        y += kLegendRow;
      }
      if (series.kind == ChartSeries::Kind::band) {
        svg +=
            fmt::format("<rect class=\"band f{}\" x=\"{}\" y=\"{}\" width=\"34\" height=\"12\"/>",
                        series.style % 8, x, y - 10.0);
      } else {
        if (series.kind == ChartSeries::Kind::line) {
          svg += fmt::format("<path class=\"sw {}\" d=\"M{} {}h36\"/>", style_classes(series.style),
                             x, y - 4.0);
        }
        if (!series.bare) svg += marker_of(series, x + 18.0, y - 4.0);
      }
      svg += fmt::format("<text x=\"{}\" y=\"{}\">{}</text>", x + 42.0, y + 1.0,
                         html_escaped(series.name));
      x += width;
    }
    legend_height_ = y - (kTop + kPlotHeight + 64.0) + kLegendRow;
    // Markers of the legend stay when a zoom hides those of the curves.
    std::size_t at = 0;
    while ((at = svg.find("\"mk ", at)) != std::string::npos) svg.replace(at, 4, "\"sw ");
    return svg;
  }

  const Chart& chart_;
  Scale x_;
  Scale y_;
  std::vector<double> x_ticks_;
  std::vector<double> y_ticks_;
  std::vector<std::string> y_labels_;
  double left_ = 0.0;
  double right_ = 0.0;
  double legend_height_ = 0.0;
  mutable bool first_step_ = true;
};

}  // namespace

std::vector<double> nice_ticks(double low, double high, int most) {
  const double raw = (high - low) / std::max(1, most);
  const double power = std::pow(10.0, std::floor(std::log10(raw)));
  double step = 10.0 * power;
  for (const double nice : {1.0, 2.0, 2.5, 5.0}) {
    if (nice * power >= raw * (1.0 - 1e-9)) {
      step = nice * power;
      break;
    }
  }
  std::vector<double> ticks;
  const double first = std::ceil(low / step - 1e-9);
  for (double k = first; k * step <= high + 1e-9 * step; k += 1.0) ticks.push_back(k * step);
  return ticks;
}

std::vector<double> log_ticks(double low, double high) {
  std::vector<double> decades;
  std::vector<double> fine;
  const double first = std::floor(std::log10(low) - 1e-9);
  const double last = std::ceil(std::log10(high) + 1e-9);
  const double every = std::max(1.0, std::ceil((last - first) / 8.0));
  for (double k = first; k <= last; k += 1.0) {
    for (const double m : {1.0, 2.0, 5.0}) {
      const double tick = m * std::pow(10.0, k);
      if (tick < low * (1.0 - 1e-9) || tick > high * (1.0 + 1e-9)) continue;
      fine.push_back(tick);
      if (m < 1.5 && std::fmod(k - first, every) < 0.5) decades.push_back(tick);
    }
  }
  return decades.size() < 3 ? fine : decades;
}

std::string svg_of(const Chart& chart) { return ChartDrawing(chart).svg(); }

std::string style_classes(std::size_t style) {
  return fmt::format("k{} d{}", style % 8, style % 5);
}

std::string csv_of(const Chart& chart) {
  bool edges = false;
  for (const ChartSeries& series : chart.series) edges = edges || !series.low.empty();
  std::vector<std::string> head = {"series", title_of(chart.x), title_of(chart.y)};
  if (edges) head.insert(head.end(), {"low", "high"});
  std::vector<std::vector<std::string>> rows;
  for (const ChartSeries& series : chart.series) {
    for (std::size_t i = 0; i < series.points.size(); ++i) {
      rows.push_back({series.name, fmt::format("{:.6g}", series.points[i].x),
                      fmt::format("{:.6g}", series.points[i].y)});
      if (!edges) continue;
      const bool here = i < series.low.size() && i < series.high.size();
      rows.back().push_back(here ? fmt::format("{:.6g}", series.low[i]) : "");
      rows.back().push_back(here ? fmt::format("{:.6g}", series.high[i]) : "");
    }
  }
  return csv_of(head, rows);
}

}  // namespace stillzone::cli
