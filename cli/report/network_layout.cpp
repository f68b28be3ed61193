#include "cli/report/network_layout.hpp"

#include <fmt/format.h>
#include <graphviz/gvc.h>

#include <memory>

#include "core/require.hpp"

namespace stillzone::cli {

namespace {

constexpr double kPerInch = 72.0;
constexpr int kPointsPerPiece = 12;  // of one Bezier piece

/// The request in the language of dot. Labels are empty tables of the size we need: the text is
/// drawn by us, so fonts known to Graphviz do not matter.
std::string dot_text(const LayoutRequest& request) {
  std::string dot =
      "digraph g { rankdir=LR; nodesep=0.3; ranksep=0.45; splines=true;\n"
      "node [shape=box, fixedsize=true, label=\"\"]; edge [arrowhead=none];\n";
  std::string left;
  std::string right;
  for (std::size_t i = 0; i < request.boxes.size(); ++i) {
    const auto& box = request.boxes[i];
    dot += fmt::format("n{} [width={:.4f}, height={:.4f}];\n", i, box.width / kPerInch,
                       box.height / kPerInch);
    if (box.side == LayoutRequest::Side::left) left += fmt::format(" n{};", i);
    if (box.side == LayoutRequest::Side::right) right += fmt::format(" n{};", i);
  }
  if (!left.empty()) dot += "{ rank=source;" + left + " }\n";
  if (!right.empty()) dot += "{ rank=sink;" + right + " }\n";
  for (std::size_t i = 0; i < request.arrows.size(); ++i) {
    const auto& arrow = request.arrows[i];
    dot += fmt::format(
        "n{} -> n{} [id=\"{}\", label=<<TABLE BORDER=\"0\" FIXEDSIZE=\"TRUE\" WIDTH=\"{:.0f}\" "
        "HEIGHT=\"{:.0f}\"><TR><TD></TD></TR></TABLE>>];\n",
        arrow.from, arrow.to, i, arrow.label_width, arrow.label_height);
  }
  return dot + "}\n";
}

struct ContextCloser {
  void operator()(GVC_t* context) const { gvFreeContext(context); }
};

/// Counts of Graphviz are int in its older releases, std::size_t in its newer ones.
template <class Number>
std::size_t count_of(Number number) {
  return static_cast<std::size_t>(number);
}

std::vector<LayoutPoint> points_of(const splines* curve, double height) {
  std::vector<LayoutPoint> points;
  if (curve == nullptr) return points;
  for (std::size_t b = 0; b < count_of(curve->size); ++b) {
    const bezier& piece = curve->list[b];
    const std::size_t n = count_of(piece.size);
    for (std::size_t k = 0; k + 3 < n; k += 3) {
      const pointf* p = piece.list + k;
      for (int i = k == 0 ? 0 : 1; i <= kPointsPerPiece; ++i) {
        const double t = static_cast<double>(i) / kPointsPerPiece;
        const double u = 1.0 - t;
        const double c[] = {u * u * u, 3 * u * u * t, 3 * u * t * t, t * t * t};
        LayoutPoint point;
        for (std::size_t j = 0; j < 4; ++j) {
          point.x += c[j] * p[j].x;
          point.y += c[j] * p[j].y;
        }
        point.y = height - point.y;
        points.push_back(point);
      }
    }
  }
  return points;
}

Layout read_layout(graph_t* graph, const LayoutRequest& request) {
  Layout layout;
  layout.boxes.resize(request.boxes.size());
  layout.arrows.resize(request.arrows.size());
  layout.labels.resize(request.arrows.size());
  layout.width = GD_bb(graph).UR.x;
  layout.height = GD_bb(graph).UR.y;
  char id_name[] = "id";
  for (node_t* node = agfstnode(graph); node != nullptr; node = agnxtnode(graph, node)) {
    const auto i = std::stoul(agnameof(node) + 1);
    layout.boxes[i] = {ND_coord(node).x, layout.height - ND_coord(node).y};
    for (edge_t* edge = agfstout(graph, node); edge != nullptr; edge = agnxtout(graph, edge)) {
      const auto a = std::stoul(agget(edge, id_name));
      layout.arrows[a] = points_of(ED_spl(edge), layout.height);
      const textlabel_t* label = ED_label(edge);
      if (label != nullptr) layout.labels[a] = {label->pos.x, layout.height - label->pos.y};
    }
  }
  return layout;
}

}  // namespace

Layout layout_of(const LayoutRequest& request) {
  if (request.boxes.empty()) return {};
  agseterr(AGMAX);  // nothing of Graphviz may reach the user's screen
  const std::unique_ptr<GVC_t, ContextCloser> context(gvContext());
  const std::string dot = dot_text(request);
  graph_t* graph = agmemread(dot.c_str());
  SZ_REQUIRE(graph != nullptr, "the network's dot text of {} bytes is read", dot.size());
  const int failed = gvLayout(context.get(), graph, "dot");
  Layout layout;
  if (failed == 0) {
    layout = read_layout(graph, request);
    gvFreeLayout(context.get(), graph);
  }
  agclose(graph);
  SZ_REQUIRE(failed == 0, "Graphviz lays {} boxes out", request.boxes.size());
  return layout;
}

}  // namespace stillzone::cli
