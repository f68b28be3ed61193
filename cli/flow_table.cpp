#include "cli/flow_table.hpp"

#include <fmt/format.h>

#include "cli/stagnation.hpp"
#include "cli/text_table.hpp"

namespace stillzone::cli {

using network::Place;

NetworkView::NetworkView(const network::Case& the_case, const network::FlowBalance& balance,
                         const std::vector<double>& rates)
    : case_(the_case), balance_(balance), rates_(rates), inflow_(the_case.zones.size(), 0.0) {
  for (const network::Zone& zone : case_.zones) total_volume_ += zone.volume.value();
  const auto streams = balance_.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    if (streams[s].from.kind == Place::Kind::feed) total_feed_ += rates_[s];
    if (streams[s].to.kind == Place::Kind::zone) inflow_[streams[s].to.index] += rates_[s];
  }
}

std::string NetworkView::zone_table() const {
  TextTable table;
  table.column("zone", TextTable::Align::left);
  table.column("volume [m3]");
  table.column("share");
  table.column("temperature [degC]");
  table.column("through-flow [m3/d]");
  table.column("turned over in [d]");
  table.column("gas to", TextTable::Align::left);
  table.column("kLa [1/d]");
  for (std::size_t z = 0; z < case_.zones.size(); ++z) {
    const network::Zone& zone = case_.zones[z];
    table.row({zone.name, short_number(zone.volume.value()),
               percent(zone.volume.value() / total_volume_),
               fmt::format("{:.1f}", zone.temperature.value() - 273.15), short_number(inflow_[z]),
               inflow_[z] > 0.0 ? short_number(zone.volume.value() / inflow_[z]) : "-",
               zone.gas ? case_.headspaces[zone.gas->to.value()].name : "-",
               zone.gas ? short_number(zone.gas->coefficient.value()) : "-"});
  }
  return table.text();
}

std::string NetworkView::stream_table() const {
  TextTable table;
  table.column("from", TextTable::Align::left);
  table.column("to", TextTable::Align::left);
  table.column("flow [m3/d]");
  table.column("of the feed");
  table.column("how", TextTable::Align::left);
  const auto streams = balance_.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const network::Flow& flow = case_.flows[streams[s].flow];
    std::string how = "by continuity";
    if (flow.exchange) {
      how = "exchange";
    } else if (flow.given) {
      how = "given";
    } else if (flow.share) {
      how = "share";
    }
    if (flow.schedule) how += ", schedule " + case_.schedules[flow.schedule->value()].name;
    table.row({case_.name_of(streams[s].from), case_.name_of(streams[s].to),
               short_number(rates_[s]), total_feed_ > 0.0 ? percent(rates_[s] / total_feed_) : "-",
               how});
  }
  return table.text();
}

std::vector<std::string> NetworkView::remarks() const {
  constexpr double kBypass = 1e-9;  // of the feed: less is rounding
  std::vector<std::string> remarks;
  const double retention = total_feed_ > 0.0 ? total_volume_ / total_feed_ : 0.0;
  for (std::size_t z = 0; z < case_.zones.size(); ++z) {
    const double turnover = inflow_[z] > 0.0 ? case_.zones[z].volume.value() / inflow_[z] : 0.0;
    if (turnover > kStagnantTurnovers * retention && retention > 0.0) {
      remarks.push_back(
          fmt::format("zone {} is turned over once in {} d, {:.1f} times V/Q: it "
                      "stands still",
                      case_.zones[z].name, short_number(turnover), turnover / retention));
    }
  }
  const auto streams = balance_.streams();
  for (std::size_t s = 0; s < streams.size(); ++s) {
    if (streams[s].from.kind == Place::Kind::feed && streams[s].to.kind == Place::Kind::outlet &&
        rates_[s] > kBypass * total_feed_) {
      remarks.push_back(fmt::format("{} of the feed goes from {} straight to {} and meets no zone",
                                    percent(rates_[s] / total_feed_),
                                    case_.name_of(streams[s].from), case_.name_of(streams[s].to)));
    }
  }
  remarks.insert(remarks.end(), case_.warnings.begin(), case_.warnings.end());
  remarks.insert(remarks.end(), balance_.warnings().begin(), balance_.warnings().end());
  return remarks;
}

}  // namespace stillzone::cli
