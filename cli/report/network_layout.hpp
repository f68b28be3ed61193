#pragma once

#include <cstddef>
#include <string>
#include <vector>

namespace stillzone::cli {

struct LayoutPoint {
  double x = 0.0;
  double y = 0.0;  ///< downward
};

/// What has to be placed: boxes with the room they need, and arrows with a label each.
struct LayoutRequest {
  enum class Side { any, left, right };
  struct Box {
    double width = 0.0;
    double height = 0.0;
    Side side = Side::any;
  };
  struct Arrow {
    std::size_t from = 0;
    std::size_t to = 0;
    double label_width = 0.0;
    double label_height = 0.0;
  };
  std::vector<Box> boxes;
  std::vector<Arrow> arrows;
};

struct Layout {
  double width = 0.0;
  double height = 0.0;
  std::vector<LayoutPoint> boxes;                ///< middles
  std::vector<std::vector<LayoutPoint>> arrows;  ///< points along each way, from box to box
  std::vector<LayoutPoint> labels;               ///< middles
};

/// Positions by Graphviz (dot, left to right), in drawing units. Same request, same layout.
/// Not for concurrent use: Graphviz is not.
[[nodiscard]] Layout layout_of(const LayoutRequest& request);

}  // namespace stillzone::cli
