#include "network/transport.hpp"

#include <map>
#include <utility>

namespace stillzone::network {

Transport::Transport(const Case& the_case, std::span<const Stream> streams,
                     const StateLayout& layout)
    : layout_(layout),
      streams_(streams.begin(), streams.end()),
      loss_(layout.n_zones(), 0.0),
      fed_(layout.n_zones() * layout.n_components(), 0.0) {
  for (const Zone& zone : the_case.zones) volume_.push_back(zone.volume.value());
  std::map<std::pair<std::size_t, std::size_t>, std::vector<std::size_t>> between;
  for (std::size_t s = 0; s < streams_.size(); ++s) {
    const Stream& stream = streams_[s];
    if (stream.from.kind != Place::Kind::zone || stream.to.kind != Place::Kind::zone) continue;
    between[{stream.from.index, stream.to.index}].push_back(s);
  }
  for (auto& [ends, numbers] : between) {
    links_.push_back({ends.first, ends.second, std::move(numbers), 0.0, {}});
  }
}

void Transport::set(const OperatingPoint& point) {
  const std::size_t n = layout_.n_components();
  loss_.assign(loss_.size(), 0.0);
  fed_.assign(fed_.size(), 0.0);
  for (std::size_t s = 0; s < streams_.size(); ++s) {
    const auto& [from, to, flow] = streams_[s];
    if (from.kind == Place::Kind::zone) loss_[from.index] += point.rates[s];
    if (from.kind != Place::Kind::feed || to.kind != Place::Kind::zone) continue;
    const auto state = point.feed(from.index, n);
    for (std::size_t i = 0; i < n; ++i) fed_[to.index * n + i] += point.rates[s] * state[i];
  }
  for (Link& link : links_) {
    link.rate = 0.0;
    for (const std::size_t s : link.streams) link.rate += point.rates[s];
  }
}

void Transport::add_rates(std::span<const double> y, std::span<double> f) const {
  const std::size_t n = layout_.n_components();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    const auto c = layout_.components(y, z);
    const auto dc = layout_.components(f, z);
    const double per_volume = 1.0 / volume_[z];
    for (std::size_t i = 0; i < n; ++i) {
      dc[i] += (fed_[z * n + i] - loss_[z] * c[i]) * per_volume;
    }
  }
  for (const Link& link : links_) {
    const auto c = layout_.components(y, link.from);
    const auto dc = layout_.components(f, link.to);
    const double rate = link.rate / volume_[link.to];
    for (std::size_t i = 0; i < n; ++i) dc[i] += rate * c[i];
  }
}

std::vector<core::SparsePattern::Entry> Transport::entries() const {
  std::vector<core::SparsePattern::Entry> entries;
  const auto add = [&](std::size_t to, std::size_t from) {
    for (std::size_t i = 0; i < layout_.n_components(); ++i) {
      entries.push_back({static_cast<std::int64_t>(layout_.in_zone(to, i)),
                         static_cast<std::int64_t>(layout_.in_zone(from, i))});
    }
  };
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) add(z, z);
  for (const Link& link : links_) add(link.to, link.from);
  return entries;
}

void Transport::locate(const core::SparsePattern& pattern) {
  diagonal_.clear();
  const auto find = [&](std::size_t to, std::size_t from, std::size_t i) {
    return static_cast<std::size_t>(
        pattern.find(static_cast<std::int64_t>(layout_.in_zone(to, i)),
                     static_cast<std::int64_t>(layout_.in_zone(from, i))));
  };
  const std::size_t n = layout_.n_components();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    for (std::size_t i = 0; i < n; ++i) diagonal_.push_back(find(z, z, i));
  }
  for (Link& link : links_) {
    link.position.clear();
    for (std::size_t i = 0; i < n; ++i) link.position.push_back(find(link.to, link.from, i));
  }
}

void Transport::add_jacobian(std::span<double> values) const {
  const std::size_t n = layout_.n_components();
  for (std::size_t z = 0; z < layout_.n_zones(); ++z) {
    for (std::size_t i = 0; i < n; ++i) values[diagonal_[z * n + i]] -= loss_[z] / volume_[z];
  }
  for (const Link& link : links_) {
    const double rate = link.rate / volume_[link.to];
    for (const std::size_t position : link.position) values[position] += rate;
  }
}

}  // namespace stillzone::network
