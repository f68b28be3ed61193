#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

namespace stillzone::cli {

/// What the network figure draws, in drawing terms only.
struct NetworkDrawing {
  struct Box {
    enum class Kind { zone, feed, outlet };
    Kind kind = Kind::zone;
    std::string name;
    double volume = 0.0;                   ///< [m3] zones only
    std::string note;                      ///< second line: "680 m3, 5.7 d"
    bool stagnant = false;                 ///< hatched
    bool short_circuit = false;            ///< fed and drained at the same place
    std::optional<std::size_t> headspace;  ///< its gas goes there
  };
  struct Arrow {
    std::size_t from = 0;  ///< index into boxes
    std::size_t to = 0;
    bool exchange = false;  ///< both ways: drawn with two heads
    double flow = 0.0;      ///< [m3/d], of an exchange the smaller direction, >= 0
    double back = 0.0;      ///< [m3/d] exchange: to -> from
    bool short_circuit = false;
  };
  struct Dome {
    std::string name;
    std::string note;  ///< "2 956 m3/d gas"
  };
  std::vector<Box> boxes;
  std::vector<Arrow> arrows;
  std::vector<Dome> domes;
};

/// The zone network as an <svg> element: feeds left, outlets right, headspaces above; areas go with
/// volumes, arrow widths with the root of the flow. Positions by Graphviz (dot, left to right).
/// @return empty when there is nothing to draw
[[nodiscard]] std::string svg_of(const NetworkDrawing& drawing);

}  // namespace stillzone::cli
