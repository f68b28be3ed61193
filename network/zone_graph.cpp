#include "network/zone_graph.hpp"

#include <algorithm>
#include <boost/graph/adjacency_list.hpp>
#include <boost/graph/breadth_first_search.hpp>
#include <boost/graph/connected_components.hpp>
#include <boost/graph/strong_components.hpp>

#include "core/require.hpp"

namespace stillzone::network {

namespace {

using Directed = boost::adjacency_list<boost::vecS, boost::vecS, boost::directedS>;
using Undirected = boost::adjacency_list<boost::vecS, boost::vecS, boost::undirectedS>;

std::vector<bool> reached(const Directed& graph, std::span<const std::size_t> starts) {
  const std::size_t n = boost::num_vertices(graph);
  std::vector<boost::default_color_type> colours(n, boost::white_color);
  const auto colour_map =
      boost::make_iterator_property_map(colours.begin(), get(boost::vertex_index, graph));
  for (const std::size_t start : starts) {
    SZ_REQUIRE(start < n, "place {} of {}", start, n);
    if (colours[start] != boost::white_color) continue;
    boost::queue<std::size_t> queue;
    boost::breadth_first_visit(graph, start, queue, boost::default_bfs_visitor(), colour_map);
  }
  std::vector<bool> result(n);
  for (std::size_t place = 0; place < n; ++place) {
    result[place] = colours[place] != boost::white_color;
  }
  return result;
}

}  // namespace

struct ZoneGraph::Impl {
  explicit Impl(std::size_t n_places)
      : forward(n_places), backward(n_places), undirected(n_places) {}
  Directed forward;
  Directed backward;
  Undirected undirected;
};

ZoneGraph::ZoneGraph(std::size_t n_places, std::span<const Link> links) {
  auto impl = std::make_unique<Impl>(n_places);
  for (const Link& link : links) {
    SZ_REQUIRE(link.from < n_places && link.to < n_places, "link {} to {} of {}", link.from,
               link.to, n_places);
    boost::add_edge(link.from, link.to, impl->forward);
    boost::add_edge(link.to, link.from, impl->backward);
    boost::add_edge(link.from, link.to, impl->undirected);
  }
  impl_ = std::move(impl);
}

ZoneGraph::~ZoneGraph() = default;

std::vector<bool> ZoneGraph::reached_from(std::span<const std::size_t> starts) const {
  return reached(impl_->forward, starts);
}

std::vector<bool> ZoneGraph::leading_to(std::span<const std::size_t> ends) const {
  return reached(impl_->backward, ends);
}

std::vector<std::vector<std::size_t>> ZoneGraph::loops() const {
  const std::size_t n = boost::num_vertices(impl_->forward);
  std::vector<std::size_t> group(n);
  const std::size_t n_groups = boost::strong_components(
      impl_->forward,
      boost::make_iterator_property_map(group.begin(), get(boost::vertex_index, impl_->forward)));
  std::vector<std::vector<std::size_t>> members(n_groups);
  for (std::size_t place = 0; place < n; ++place) members[group[place]].push_back(place);
  std::erase_if(members, [](const auto& places) { return places.size() < 2; });
  std::ranges::sort(members, {}, [](const auto& places) { return places.front(); });
  return members;
}

std::vector<std::size_t> ZoneGraph::parts() const {
  const std::size_t n = boost::num_vertices(impl_->undirected);
  std::vector<std::size_t> part(n);
  boost::connected_components(
      impl_->undirected,
      boost::make_iterator_property_map(part.begin(), get(boost::vertex_index, impl_->undirected)));
  return part;
}

}  // namespace stillzone::network
