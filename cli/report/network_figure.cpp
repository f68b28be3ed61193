#include "cli/report/network_figure.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "cli/report/network_layout.hpp"
#include "cli/report/page.hpp"

namespace stillzone::cli {

namespace {

constexpr double kLetter = 8.7;  // mean width at the drawing's letter size, bold
constexpr double kLine = 18.0;
constexpr double kLeastSide = 14.0;
constexpr double kWidestArrow = 11.0;
constexpr double kThinnestArrow = 1.5;
constexpr double kPad = 12.0;
constexpr double kDomeHeight = 58.0;
constexpr std::size_t kLongestName = 24;

struct Rect {
  double x = 0.0;  ///< left
  double y = 0.0;  ///< top
  double width = 0.0;
  double height = 0.0;

  [[nodiscard]] bool holds(LayoutPoint p) const {
    return p.x > x && p.x < x + width && p.y > y && p.y < y + height;
  }
  [[nodiscard]] double middle() const { return x + 0.5 * width; }
};

/// Number of letters shown; UTF-8 counts by code point.
std::size_t n_letters(const std::string& text) {
  return static_cast<std::size_t>(std::count_if(text.begin(), text.end(), [](char c) {
    return (static_cast<unsigned char>(c) & 0xC0U) != 0x80U;
  }));
}
double text_width(const std::string& text) {
  return kLetter * static_cast<double>(n_letters(text));
}

std::string shortened(const std::string& name) {
  if (n_letters(name) <= kLongestName) return name;
  std::size_t end = 0;
  for (std::size_t letters = 0; letters < kLongestName - 1; ++letters) {
    ++end;
    while (end < name.size() && (static_cast<unsigned char>(name[end]) & 0xC0U) == 0x80U) ++end;
  }
  return name.substr(0, end) + "\u2026";
}

std::string text_at(double x, double y, const std::string& classes, const std::string& text) {
  return fmt::format("<text class=\"{}\" x=\"{:.1f}\" y=\"{:.1f}\">{}</text>", classes, x, y,
                     html_escaped(text));
}

/// A line of words: text and class.
using Words = std::vector<std::pair<std::string, std::string>>;

/// Cuts a way to what lies outside both its boxes.
std::vector<LayoutPoint> outside(std::vector<LayoutPoint> way, const Rect& tail, const Rect& head) {
  const auto cross = [](LayoutPoint inside, LayoutPoint out, const Rect& box) {
    for (int i = 0; i < 30; ++i) {
      const LayoutPoint half{0.5 * (inside.x + out.x), 0.5 * (inside.y + out.y)};
      (box.holds(half) ? inside : out) = half;
    }
    return out;
  };
  std::size_t first = 0;
  while (first + 1 < way.size() && tail.holds(way[first])) ++first;
  if (first > 0) way[first - 1] = cross(way[first - 1], way[first], tail), --first;
  std::size_t last = way.size();
  while (last > first + 2 && head.holds(way[last - 1])) --last;
  if (last < way.size()) {
    way[last] = cross(way[last], way[last - 1], head);
    ++last;
  }
  return {way.begin() + static_cast<std::ptrdiff_t>(first),
          way.begin() + static_cast<std::ptrdiff_t>(last)};
}

/// Takes `length` off the end of a way; gives the point where it ended.
LayoutPoint shorten(std::vector<LayoutPoint>& way, double length) {
  const LayoutPoint end = way.back();
  while (way.size() > 1) {
    const LayoutPoint before = way[way.size() - 2];
    const double reach = std::hypot(end.x - before.x, end.y - before.y);
    if (reach > length) {
      const LayoutPoint now = way.back();
      const double here = std::hypot(end.x - now.x, end.y - now.y);
      const double share = (length - here) / std::max(1e-9, reach - here);
      way.back() = {now.x + share * (before.x - now.x), now.y + share * (before.y - now.y)};
      return end;
    }
    if (way.size() == 2) return end;
    way.pop_back();
  }
  return end;
}

std::string head_of(LayoutPoint from, LayoutPoint tip, double half, const char* style) {
  const double size = std::max(1e-9, std::hypot(tip.x - from.x, tip.y - from.y));
  const double nx = -(tip.y - from.y) / size * half;
  const double ny = (tip.x - from.x) / size * half;
  return fmt::format("<path class=\"{}\" d=\"M{:.1f} {:.1f}L{:.1f} {:.1f}L{:.1f} {:.1f}z\"/>",
                     style, tip.x, tip.y, from.x + nx, from.y + ny, from.x - nx, from.y - ny);
}

class Drawing {
 public:
  explicit Drawing(const NetworkDrawing& drawing) : drawing_(drawing) {
    for (const auto& box : drawing.boxes) {
      largest_ = std::max(largest_, box.volume);
      if (box.kind == NetworkDrawing::Box::Kind::zone) ++n_zones_;
    }
    for (const auto& arrow : drawing.arrows) {
      widest_ = std::max(widest_, std::max(arrow.flow, arrow.back));
    }
    side_ = n_zones_ <= 4 ? 118.0 : n_zones_ <= 12 ? 92.0 : 66.0;
    place();
  }

  std::string svg() {
    std::string parts;
    for (std::size_t i = 0; i < drawing_.arrows.size(); ++i) parts += arrow(i);
    parts += gas();
    for (std::size_t i = 0; i < drawing_.boxes.size(); ++i) parts += box(i);
    for (std::size_t i = 0; i < drawing_.arrows.size(); ++i) parts += label(i);
    height_ = top_ + layout_.height + kPad;
    return fmt::format(
        "<div class=scroll><svg class=\"net\" viewBox=\"0 0 {0:.0f} {1:.0f}\" width=\"{0:.0f}\" "
        "height=\"{1:.0f}\" style=\"max-width:{2:.0f}px;min-width:min({0:.0f}px,{3:.0f}px)\" "
        "role=\"img\"><title>Zone network</title><desc>{4}</desc><defs><pattern id=\"hatch\" "
        "width=\"8\" height=\"8\" patternUnits=\"userSpaceOnUse\" patternTransform=\"rotate(45)\">"
        "<path class=\"hatch\" d=\"M0 0v8\"/></pattern></defs>{5}</svg></div>{6}",
        width_, height_, 1.15 * width_, 0.8 * width_, html_escaped(in_words()), parts, legend());
  }

 private:
  using Box = NetworkDrawing::Box;

  [[nodiscard]] Words words_of(const Box& box) const {
    Words words{{shortened(box.name), "b"}};
    if (!box.note.empty()) words.emplace_back(box.note, "q");
    if (box.stagnant) words.emplace_back("stagnant", "b");
    if (box.short_circuit) words.emplace_back("short circuit", "flag");
    return words;
  }

  /// Width and height of the drawn box; words stand below a zone and inside a feed or outlet.
  [[nodiscard]] std::pair<double, double> size_of(const Box& box) const {
    if (box.kind != Box::Kind::zone) {
      double wide = 0.0;
      for (const auto& [text, style] : words_of(box)) wide = std::max(wide, text_width(text));
      return {wide + 40.0, kLine * static_cast<double>(words_of(box).size()) + 12.0};
    }
    const double side =
        std::max(kLeastSide, side_ * std::sqrt(box.volume / std::max(1e-9, largest_)));
    return {1.2 * side, side / 1.2};
  }

  void place() {
    LayoutRequest request;
    for (const Box& box : drawing_.boxes) {
      auto [wide, high] = size_of(box);
      if (box.kind == Box::Kind::zone) {
        const Words words = words_of(box);
        for (const auto& [text, style] : words) wide = std::max(wide, text_width(text));
        high += 2.0 * (kLine * static_cast<double>(words.size()) + 6.0);
      }
      const auto side = box.kind == Box::Kind::feed     ? LayoutRequest::Side::left
                        : box.kind == Box::Kind::outlet ? LayoutRequest::Side::right
                                                        : LayoutRequest::Side::any;
      request.boxes.push_back({wide + 6.0, high, side});
    }
    for (const auto& arrow : drawing_.arrows) {
      request.arrows.push_back(
          {arrow.from, arrow.to, text_width(flow_words(arrow)) + 8.0, kLine + 8.0});
    }
    layout_ = layout_of(request);
    top_ = kPad + (drawing_.domes.empty() ? 0.0 : kDomeHeight + 16.0);
    for (std::size_t i = 0; i < drawing_.boxes.size(); ++i) {
      const auto [wide, high] = size_of(drawing_.boxes[i]);
      LayoutPoint& middle = layout_.boxes[i];
      middle = {middle.x + kPad, middle.y + top_};
      rects_.push_back({middle.x - 0.5 * wide, middle.y - 0.5 * high, wide, high});
      const auto& room = request.boxes[i];
      rooms_.push_back(
          {middle.x - 0.5 * room.width, middle.y - 0.5 * room.height, room.width, room.height});
    }
    for (std::size_t i = 0; i < drawing_.arrows.size(); ++i) {
      for (LayoutPoint& p : layout_.arrows[i]) p = {p.x + kPad, p.y + top_};
      LayoutPoint& p = layout_.labels[i];
      p = {p.x + kPad, p.y + top_};
      const auto& room = request.arrows[i];
      labels_.push_back({p.x - 0.5 * room.label_width, p.y - 0.5 * room.label_height,
                         room.label_width, room.label_height});
    }
    width_ = layout_.width + 2.0 * kPad;
    if (drawing_.domes.empty()) lift();
  }

  /// Takes away the empty room above the highest box, which the layout keeps for evenness.
  void lift() {
    double top = top_ + layout_.height;
    for (const Rect& rect : rects_) top = std::min(top, rect.y);
    for (const Rect& label : labels_) top = std::min(top, label.y);
    for (const auto& way : layout_.arrows) {
      for (const LayoutPoint& p : way) top = std::min(top, p.y - 8.0);
    }
    const double by = std::max(0.0, top - kPad);
    top_ -= by;
    for (LayoutPoint& middle : layout_.boxes) middle.y -= by;
    for (LayoutPoint& label : layout_.labels) label.y -= by;
    for (auto& way : layout_.arrows) {
      for (LayoutPoint& p : way) p.y -= by;
    }
    for (auto* rects : {&rects_, &rooms_, &labels_}) {
      for (Rect& rect : *rects) rect.y -= by;
    }
  }

  static std::string flow_words(const NetworkDrawing::Arrow& arrow) {
    if (!arrow.exchange) return brief(arrow.flow, 3);
    if (std::fabs(arrow.flow - arrow.back) <= 1e-6 * std::max(arrow.flow, arrow.back)) {
      return "\u21C4 " + brief(arrow.flow, 3);
    }
    return brief(arrow.flow, 3) + " \u21C4 " + brief(arrow.back, 3);
  }

  [[nodiscard]] double width_of(double flow) const {
    return std::max(kThinnestArrow, kWidestArrow * std::sqrt(flow / std::max(1e-12, widest_)));
  }

  std::string arrow(std::size_t i) {
    const auto& arrow = drawing_.arrows[i];
    std::vector<LayoutPoint> way;
    way.reserve(layout_.arrows[i].size() + 2);
    way.push_back(layout_.boxes[arrow.from]);
    for (const LayoutPoint& p : layout_.arrows[i]) way.push_back(p);
    way.push_back(layout_.boxes[arrow.to]);
    way = outside(std::move(way), rects_[arrow.from], rects_[arrow.to]);
    const double wide = width_of(std::max(arrow.flow, arrow.back));
    const double head = 8.0 + wide;
    const char* head_style = arrow.short_circuit ? "headshort" : "head";
    const LayoutPoint tip = shorten(way, head);
    std::string heads = head_of(way.back(), tip, 3.5 + 0.8 * wide, head_style);
    if (arrow.exchange) {
      std::reverse(way.begin(), way.end());
      const LayoutPoint back = shorten(way, head);
      heads += head_of(way.back(), back, 3.5 + 0.8 * wide, head_style);
    }
    std::string path;
    for (std::size_t k = 0; k < way.size(); ++k) {
      path += fmt::format("{}{:.1f} {:.1f}", k == 0 ? "M" : k == 1 ? "L" : " ", way[k].x, way[k].y);
    }
    return fmt::format("<path class=\"pipe{}\" stroke-width=\"{:.1f}\" d=\"{}\"/>{}",
                       arrow.short_circuit ? " short" : "", wide, path, heads);
  }

  [[nodiscard]] std::string label(std::size_t i) const {
    const LayoutPoint p = layout_.labels[i];
    return text_at(p.x, p.y + 5.0, "c halo", flow_words(drawing_.arrows[i]));
  }

  [[nodiscard]] std::string box(std::size_t i) const {
    const Box& box = drawing_.boxes[i];
    const Rect& r = rects_[i];
    std::string svg =
        fmt::format("<g><title>{}: {}</title>", html_escaped(box.name), html_escaped(box.note));
    double line = r.y + r.height + 16.0;
    if (box.kind == Box::Kind::zone) {
      const std::string shape =
          fmt::format("x=\"{:.1f}\" y=\"{:.1f}\" width=\"{:.1f}\" height=\"{:.1f}\" rx=\"5\"", r.x,
                      r.y, r.width, r.height);
      svg += fmt::format("<rect class=\"tank\" {}/>", shape);
      if (box.stagnant) svg += fmt::format("<rect fill=\"url(#hatch)\" {}/>", shape);
    } else {
      const double point = 14.0;
      svg += fmt::format(
          "<path class=\"tank\" d=\"M{0:.1f} {1:.1f}h{2:.1f}l{3} {4:.1f}l-{3} "
          "{4:.1f}h-{2:.1f}z\"/>",
          r.x, r.y, r.width - point, point, 0.5 * r.height);
      line = r.y + 20.0;
    }
    const double x = r.middle() - (box.kind == Box::Kind::zone ? 0.0 : 4.0);
    for (const auto& [text, style] : words_of(box)) {
      svg += text_at(x, line, "c halo " + style, text);
      line += kLine;
    }
    return svg + "</g>";
  }

  /// Where gas of zone i can rise straight up without meeting another box or a number.
  [[nodiscard]] std::optional<double> free_riser(std::size_t i) const {
    const Rect& r = rects_[i];
    for (const double share : {0.5, 0.25, 0.75, 0.1, 0.9}) {
      const double x = r.x + share * r.width;
      bool free = true;
      const auto meets = [&](const Rect& other) {
        return other.x - 4.0 < x && x < other.x + other.width + 4.0 && other.y < r.y;
      };
      for (std::size_t k = 0; k < rooms_.size(); ++k) free = free && (k == i || !meets(rooms_[k]));
      for (const Rect& other : labels_) free = free && !meets(other);
      if (free) return x;
    }
    return std::nullopt;
  }

  /// Headspaces side by side above what gives them gas.
  [[nodiscard]] std::vector<Rect> dome_rects() const {
    std::vector<Rect> domes;
    double from = kPad;
    for (std::size_t d = 0; d < drawing_.domes.size(); ++d) {
      const auto& dome = drawing_.domes[d];
      double low = width_;
      double high = 0.0;
      for (std::size_t i = 0; i < drawing_.boxes.size(); ++i) {
        if (drawing_.boxes[i].headspace != d) continue;
        low = std::min(low, rects_[i].x);
        high = std::max(high, rects_[i].x + rects_[i].width);
      }
      const double needed =
          40.0 + std::max(text_width(shortened(dome.name)), text_width(dome.note));
      const double room = (width_ - kPad - from) / static_cast<double>(drawing_.domes.size() - d);
      double wide = std::max(needed, std::min(high - low, room - 12.0));
      double left = std::max(from, std::min(low, width_ - kPad - wide));
      if (high < low) left = from;
      domes.push_back({left, kPad, wide, kDomeHeight});
      from = left + wide + 12.0;
    }
    return domes;
  }

  /// Name of the headspace beside a short gas arrow, on the side where it meets no other text; left
  /// out where there is none (the tables of the report say it too).
  [[nodiscard]] std::string stub_name(std::size_t i, double x, double y,
                                      const std::string& name) const {
    const double wide = text_width(name);
    for (const double left : {x + 7.0, x - 7.0 - wide}) {
      const auto meets = [&](const Rect& other) {
        return other.x < left + wide && left < other.x + other.width && other.y < y + 6.0 &&
               y - 14.0 < other.y + other.height;
      };
      bool free = left > 2.0 && left + wide < width_ - 2.0;
      for (std::size_t k = 0; k < rooms_.size(); ++k) free = free && (k == i || !meets(rooms_[k]));
      free = free && std::none_of(labels_.begin(), labels_.end(), meets);
      if (free) return text_at(left, y, "q halo", name);
    }
    return "";
  }

  std::string gas() {
    std::string svg;
    const std::vector<Rect> domes = dome_rects();
    for (std::size_t d = 0; d < domes.size(); ++d) {
      const Rect& r = domes[d];
      const auto& dome = drawing_.domes[d];
      width_ = std::max(width_, r.x + r.width + kPad);
      svg += fmt::format(
          "<g><path class=\"dome\" d=\"M{0:.1f} {1:.1f}v-{2}q0-22 24-22h{3:.1f}q24 0 24 "
          "22v{2}z\"/>",
          r.x, r.y + r.height, r.height - 22.0, r.width - 48.0);
      svg += text_at(r.middle(), r.y + 25.0, "c b", shortened(dome.name)) +
             text_at(r.middle(), r.y + 45.0, "c q", dome.note) + "</g>";
    }
    for (std::size_t i = 0; i < drawing_.boxes.size(); ++i) {
      const auto& to = drawing_.boxes[i].headspace;
      if (!to || *to >= domes.size()) continue;
      const Rect& dome = domes[*to];
      const auto x = free_riser(i);
      const bool reaches = x && *x > dome.x + 6.0 && *x < dome.x + dome.width - 6.0;
      const double at = reaches ? *x : rects_[i].middle();
      const double end = reaches ? dome.y + dome.height + 2.0 : rects_[i].y - 24.0;
      svg += fmt::format("<path class=\"gas\" d=\"M{:.1f} {:.1f}V{:.1f}\"/>", at, rects_[i].y - 2.0,
                         end + 7.0);
      svg += head_of({at, end + 8.0}, {at, end}, 3.5, "gashead");
      if (!reaches && domes.size() > 1) {
        svg += stub_name(i, at, end + 14.0, shortened(drawing_.domes[*to].name));
      }
    }
    return svg;
  }

  [[nodiscard]] std::string legend() const {
    std::vector<std::pair<std::string, std::string>> rows;
    rows.emplace_back(
        fmt::format("<rect class=\"tank\" x=\"2\" y=\"-13\" width=\"30\" height=\"18\" rx=\"4\"/>"),
        "zone: area goes with volume, the tiniest enlarged");
    const double wide = width_of(widest_);
    rows.emplace_back(
        fmt::format("<path class=\"pipe\" stroke-width=\"{:.1f}\" d=\"M2-5h24\"/>{}", wide,
                    head_of({25.0, -5.0}, {40.0, -5.0}, 3.5 + 0.8 * wide, "head")),
        fmt::format("flow in m\u00B3/d: width goes with its root; this is {}", brief(widest_, 3)));
    rows.emplace_back("<path class=\"pipe\" stroke-width=\"3\" d=\"M12-5h20\"/>" +
                          head_of({12.0, -5.0}, {2.0, -5.0}, 6.0, "head") +
                          head_of({30.0, -5.0}, {40.0, -5.0}, 6.0, "head"),
                      "\u21C4 exchange: as much each way, or one number each way");
    if (!drawing_.domes.empty()) {
      rows.emplace_back("<path class=\"gas\" d=\"M16 4V-10\"/>" +
                            head_of({16.0, -9.0}, {16.0, -17.0}, 3.5, "gashead"),
                        "gas to the headspace above");
    }
    rows.emplace_back(
        "<rect class=\"tank\" x=\"2\" y=\"-13\" width=\"30\" height=\"18\" rx=\"4\"/><rect "
        "fill=\"url(#hatch)\" x=\"2\" y=\"-13\" width=\"30\" height=\"18\" rx=\"4\"/>",
        "stagnant: turned over more slowly than V/Q");
    rows.emplace_back("<path class=\"pipe short\" stroke-width=\"3\" d=\"M2-5h38\"/>",
                      "short circuit: from feed to outlet at once");
    std::string html = "<ul class=key>";
    for (const auto& [sample, words] : rows) {
      html += fmt::format(
          "<li><svg viewBox=\"0 -18 44 24\" width=\"44\" height=\"24\" "
          "aria-hidden=\"true\">{}</svg>"
          "<span>{}</span></li>",
          sample, words);
    }
    return html + "</ul>";
  }

  /// The alternative text.
  [[nodiscard]] std::string in_words() const {
    std::string words;
    for (const Box& box : drawing_.boxes) {
      if (box.kind != Box::Kind::zone) continue;
      words +=
          fmt::format("Zone {}: {}{}{}. ", box.name, box.note, box.stagnant ? ", stagnant" : "",
                      box.short_circuit ? ", fed and drained at the same place" : "");
    }
    for (const auto& arrow : drawing_.arrows) {
      words += fmt::format("{} {} {}: {} m3/d. ", drawing_.boxes[arrow.from].name,
                           arrow.exchange ? "exchanges with" : "to", drawing_.boxes[arrow.to].name,
                           flow_words(arrow));
    }
    return words;
  }

  const NetworkDrawing& drawing_;
  Layout layout_;
  std::vector<Rect> rects_;   ///< as drawn
  std::vector<Rect> rooms_;   ///< with their words
  std::vector<Rect> labels_;  ///< numbers of the flows
  std::size_t n_zones_ = 0;
  double largest_ = 0.0;
  double widest_ = 0.0;
  double side_ = 100.0;
  double top_ = 0.0;
  double width_ = 0.0;
  double height_ = 0.0;
};

}  // namespace

std::string svg_of(const NetworkDrawing& drawing) {
  if (drawing.boxes.empty()) return "";
  return Drawing(drawing).svg();
}

}  // namespace stillzone::cli
