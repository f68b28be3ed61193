#pragma once

#include <string>
#include <vector>

namespace stillzone::cli {

struct Bar {
  std::string name;
  double value = 0.0;
  bool hollow = false;  ///< an outlet beside the zones
};

/// Values of one quantity side by side: level bars from a common base with their numbers.
/// @param base where the bars start; 0 for amounts, 6 for pH, so that differences show
/// @return an <svg> element with alternative text
[[nodiscard]] std::string svg_of_bars(const std::string& title, const std::vector<Bar>& bars,
                                      double base);

}  // namespace stillzone::cli
