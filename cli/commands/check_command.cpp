#include "cli/commands/check_command.hpp"

#include <fmt/format.h>

#include "cli/flow_table.hpp"
#include "cli/loaded_case.hpp"
#include "cli/text_table.hpp"

namespace stillzone::cli {
namespace {

std::string feed_table(const LoadedCase& loaded) {
  TextTable table;
  table.column("feed", TextTable::Align::left);
  table.column("flow [m3/d]");
  table.column("COD [kg/m3]");
  table.column("N [kmol/m3]");
  table.column("schedule", TextTable::Align::left);
  for (const network::Feed& feed : loaded.the_case.feeds) {
    double cod = 0.0;
    double nitrogen = 0.0;
    for (std::size_t i = 0; i < feed.state.size(); ++i) {
      const auto& content = loaded.the_case.kinetics.components[i].content;
      cod += content.cod * feed.state[i].value;
      nitrogen += content.nitrogen * feed.state[i].value;
    }
    table.row({feed.name, short_number(feed.flow.value), short_number(cod), short_number(nitrogen),
               feed.schedule ? loaded.the_case.schedules[feed.schedule->value()].name : "steady"});
  }
  return table.text();
}

int check(const CommandLine& line, Console& console) {
  const auto loaded = load_case(line, console);
  if (!loaded) return kWrongInput;
  const network::Case& the_case = loaded->the_case;
  const auto rates = loaded->balance.mean_rates(the_case, 0.0);
  const NetworkView view(the_case, loaded->balance, rates);
  console.out << fmt::format("{}: {}\n", line.input, the_case.title)
              << fmt::format("kinetics {}, {} zones of {} m3 together, feed {} m3/d, V/Q {} d\n\n",
                             the_case.kinetics.name, the_case.zones.size(),
                             short_number(view.total_volume()), short_number(view.total_feed()),
                             short_number(view.total_volume() / view.total_feed()))
              << "Zones\n"
              << view.zone_table() << "\nFlows, as balanced (schedules at their mean)\n"
              << view.stream_table() << "\nFeeds\n"
              << feed_table(*loaded);
  const auto remarks = view.remarks();
  if (!remarks.empty()) console.out << "\nWorth a look\n";
  for (const std::string& remark : remarks) console.out << "  - " << remark << "\n";
  console.out << fmt::format(
      "\nThe file is valid; the flow balance closes to {:.1e} of the feed. Nothing was written.\n",
      loaded->balance.closure_error(the_case, rates));
  return kDone;
}

}  // namespace

Command check_command() {
  return {.name = "check",
          .summary = "validates a case, closes its flow balance, prints zones and flows",
          .input_name = "CASE",
          .input_meaning = "case file",
          .input_needed = true,
          .example = "stillzone check cases/three_zone_example.json",
          .writes_output = false,
          .reads_case = true,
          .run = check};
}

}  // namespace stillzone::cli
