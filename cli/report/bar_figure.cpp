#include "cli/report/bar_figure.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/report/page.hpp"

namespace stillzone::cli {

std::string svg_of_bars(const std::string& title, const std::vector<Bar>& bars, double base) {
  constexpr double kNames = 190.0;
  constexpr double kNumbers = 100.0;
  constexpr double kRow = 26.0;
  constexpr double kWidth = 560.0;
  double longest = 0.0;
  for (const Bar& bar : bars) {
    if (std::isfinite(bar.value)) longest = std::max(longest, bar.value - base);
  }
  std::string svg;
  std::string words;
  double y = 30.0;
  for (const Bar& bar : bars) {
    const double share = longest > 0.0 && std::isfinite(bar.value)
                             ? std::clamp((bar.value - base) / longest, 0.0, 1.0)
                             : 0.0;
    const double length = std::max(1.0, share * (kWidth - kNames - kNumbers));
    std::string name = bar.name;
    if (name.size() > 18 && std::all_of(name.begin(), name.end(), [](char c) {
          return static_cast<unsigned char>(c) < 128;
        })) {
      name = name.substr(0, 17) + "\u2026";
    }
    svg += fmt::format(
        "<text class=\"e\" x=\"{:.0f}\" y=\"{:.0f}\">{}</text><rect class=\"bar{}\" x=\"{:.0f}\" "
        "y=\"{:.0f}\" width=\"{:.1f}\" height=\"15\"/><text x=\"{:.1f}\" y=\"{:.0f}\">{}</text>",
        kNames - 8.0, y + 13.0, html_escaped(name), bar.hollow ? " out" : "", kNames, y, length,
        kNames + length + 7.0, y + 13.0, shown(bar.value));
    words += fmt::format("{}: {}. ", html_escaped(bar.name), shown(bar.value));
    y += kRow;
  }
  return fmt::format(
      "<svg viewBox=\"0 0 {} {:.0f}\" role=\"img\"><title>{}</title><desc>{}</desc><text "
      "class=\"b\" "
      "x=\"4\" y=\"16\">{}</text>{}</svg>",
      kWidth, y, html_escaped(title), words, html_escaped(title), svg);
}

}  // namespace stillzone::cli
