#include "core/timeline.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <utility>

#include "core/near_name.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

constexpr double kNever = std::numeric_limits<double>::infinity();
/// Limits of written schedules [d]: keep k every exact enough, and k countable.
constexpr double kFarthest = 1e6;
constexpr double kShortest = 0.999 / 86400.0;

/// Number of the period that t lies in, exact in the sense that start(k) <= t < start(k + 1) holds
/// with start(k) computed as first + k every, the way switch times are.
double period_number(const Timeline::Periodic& periodic, double t) {
  double k = std::floor((t - periodic.first_on) / periodic.every);
  // Rounding of the division is off by one at most (two turns leave room).
  for (int i = 0; i < 2 && periodic.first_on + (k + 1.0) * periodic.every <= t; ++i) k += 1.0;
  for (int i = 0; i < 2 && periodic.first_on + k * periodic.every > t; ++i) k -= 1.0;
  return k;
}

double on_from(const Timeline::Periodic& periodic, double k) {
  return periodic.first_on + k * periodic.every;
}
double off_from(const Timeline::Periodic& periodic, double k) {
  return periodic.first_on + k * periodic.every + periodic.on_for;
}

bool inside_any(const std::vector<Timeline::Window>& windows, double t) {
  return std::any_of(windows.begin(), windows.end(), [t](const Timeline::Window& window) {
    return window.from <= t && t < window.until;
  });
}

}  // namespace

Timeline Timeline::switched(std::optional<Periodic> periodic, std::vector<Window> on,
                            std::vector<Window> off, double idle) {
  if (periodic) {
    SZ_REQUIRE(
        periodic->every > 0.0 && periodic->on_for > 0.0 && periodic->on_for <= periodic->every,
        "every {} on_for {}", periodic->every, periodic->on_for);
  }
  Timeline timeline;
  timeline.periodic_ = periodic;
  timeline.on_ = std::move(on);
  timeline.off_ = std::move(off);
  timeline.idle_ = idle;
  return timeline;
}

Timeline Timeline::steps(std::vector<double> times, std::vector<double> values) {
  SZ_REQUIRE(!times.empty() && times.size() == values.size(), "{} times, {} values", times.size(),
             values.size());
  SZ_REQUIRE(std::adjacent_find(times.begin(), times.end(), std::greater_equal<>()) == times.end(),
             "times must rise");
  Timeline timeline;
  timeline.times_ = std::move(times);
  timeline.values_ = std::move(values);
  return timeline;
}

double Timeline::value_from(double t) const {
  if (!times_.empty()) {
    const auto after = std::upper_bound(times_.begin(), times_.end(), t);
    const auto i = static_cast<std::size_t>(std::max<std::ptrdiff_t>(after - times_.begin(), 1));
    return values_[i - 1];
  }
  if (inside_any(off_, t)) return idle_;
  if (inside_any(on_, t)) return 1.0;
  // Without a periodic part: off outside "on" windows when there are any, else on.
  if (!periodic_) return on_.empty() ? 1.0 : idle_;
  return t < off_from(*periodic_, period_number(*periodic_, t)) ? 1.0 : idle_;
}

std::optional<double> Timeline::next_switch(double t) const {
  double next = kNever;
  if (!times_.empty()) {
    // The first time only matters when the value before it differs; it holds from there on.
    const auto after = std::upper_bound(times_.begin() + 1, times_.end(), t);
    if (after != times_.end()) next = *after;
  }
  if (periodic_ && periodic_->on_for < periodic_->every) {
    const double k = period_number(*periodic_, t);
    const double off = off_from(*periodic_, k);
    next = std::min(next, off > t ? off : on_from(*periodic_, k + 1.0));
  }
  for (const auto* windows : {&on_, &off_}) {
    for (const Window& window : *windows) {
      for (const double edge : {window.from, window.until}) {
        if (edge > t) next = std::min(next, edge);
      }
    }
  }
  if (!(next < kNever)) return std::nullopt;
  return next;
}

double Timeline::mean(double from, double until) const {
  if (const auto whole = period(); whole && *whole > 0.0) {
    const double on_share = periodic_->on_for / periodic_->every;
    return on_share + idle_ * (1.0 - on_share);
  }
  if (!(until > from)) return value_from(from);
  double sum = 0.0;
  double t = from;
  while (t < until) {
    const double end = std::min(next_switch(t).value_or(until), until);
    sum += value_from(t) * (end - t);
    t = end;
  }
  return sum / (until - from);
}

std::optional<double> Timeline::period() const {
  if (times_.size() == 1) return 0.0;
  if (!times_.empty() || !on_.empty() || !off_.empty()) return std::nullopt;
  if (!periodic_ || !(periodic_->on_for < periodic_->every)) return 0.0;
  return periodic_->every;
}

namespace {

using Need = ObjectReader::Need;

std::optional<double> read_time(const ReadingContext& context, const Json& node,
                                const std::string& pointer) {
  return read_quantity(context, node, pointer, Measure::duration, {});
}

std::vector<Timeline::Window> read_windows(ObjectReader& reader, const char* key) {
  std::vector<Timeline::Window> windows;
  reader.each_element(key, Need::optional, [&](const Json& node, const std::string& pointer) {
    const ReadingContext& context = reader.context();
    const auto refuse = [&](std::string found, std::string allowed, std::string way_out) {
      context.faults.add({.file = context.document.name(),
                          .pointer = pointer,
                          .line = context.document.line_of(pointer),
                          .found = std::move(found),
                          .allowed = std::move(allowed),
                          .way_out = std::move(way_out)});
    };
    if (!node.is_array() || node.size() != 2) {
      refuse(shown(node), "a window is a list of two times", "Write it like [\"10 d\", \"12 d\"].");
      return;
    }
    const auto from = read_time(context, node[0], pointer + "/0");
    const auto until = read_time(context, node[1], pointer + "/1");
    if (!from || !until) return;
    if (!(*from < *until)) {
      refuse(fmt::format("[{}, {}]", shown(node[0]), shown(node[1])),
             "a window ends after it begins", "Swap the two.");
      return;
    }
    if (!windows.empty() && *from < windows.back().until) {
      refuse(fmt::format("a window that begins at {:g} d", *from),
             fmt::format("the one before it ends at {:g} d", windows.back().until),
             "Put windows in order, without overlap.");
      return;
    }
    windows.push_back({*from, *until});
  });
  return windows;
}

std::optional<Timeline::Periodic> read_periodic(ObjectReader& reader) {
  if (!reader.has("every") && !reader.has("on_for")) {
    if (reader.has("first_on")) {
      (void)reader.raw("first_on");
      reader.fault("first_on", "\"first_on\" without \"every\"",
                   "a first switch belongs to a repeated one", "Add \"every\" and \"on_for\".");
    }
    return std::nullopt;
  }
  const auto limit = ObjectReader::positive(Measure::duration);
  const auto every = reader.quantity<Measure::duration>("every", Need::required, limit);
  const auto on_for = reader.quantity<Measure::duration>("on_for", Need::required, limit);
  const auto first_on = reader.quantity<Measure::duration>("first_on", Need::optional, {});
  if (!every || !on_for) return std::nullopt;
  if (first_on && std::abs(first_on->value()) > kFarthest) {
    reader.fault("first_on", fmt::format("{:g} d", first_on->value()),
                 fmt::format("\"first_on\" is within {:g} d of the start", kFarthest),
                 "Give the first switch after the start of the run.");
    return std::nullopt;
  }
  if (every->value() < kShortest || on_for->value() < kShortest) {
    const char* key = on_for->value() < kShortest ? "on_for" : "every";
    reader.fault(key, fmt::format("{:g} s", 86400.0 * std::min(*every, *on_for).value()),
                 "a schedule is on for 1 s at least", "Give the mean flow instead of the pulses.");
    return std::nullopt;
  }
  if (*on_for > *every) {
    reader.fault("on_for", fmt::format("{:g} d on", on_for->value()),
                 fmt::format("\"on_for\" is at most \"every\" ({:g} d)", every->value()),
                 "Shorten \"on_for\", or leave the schedule out for something always on.");
    return std::nullopt;
  }
  return Timeline::Periodic{every->value(), on_for->value(), first_on.value_or(Duration()).value()};
}

}  // namespace

std::optional<Timeline> read_schedule(ObjectReader& reader) {
  const std::size_t n_before = reader.context().faults.all().size();
  const auto periodic = read_periodic(reader);
  const double idle = reader.number("idle", Need::optional).value_or(0.0);
  if (!(idle >= 0.0 && idle <= 1.0)) {
    reader.fault("idle", fmt::format("{:g}", idle), "\"idle\" is a factor from 0 to 1",
                 "Give the share of the flow that goes on while off.");
  }
  auto on = read_windows(reader, "on");
  auto off = read_windows(reader, "off");
  if (!periodic && on.empty() && off.empty() && reader.context().faults.all().size() == n_before) {
    reader.fault("", "a schedule that never switches",
                 "a schedule repeats (\"every\", \"on_for\") or has windows (\"on\", \"off\")",
                 "Write for example {\"every\": \"1 h\", \"on_for\": \"12 min\"}.");
  }
  reader.finish();
  if (reader.context().faults.all().size() > n_before) return std::nullopt;
  return Timeline::switched(periodic, std::move(on), std::move(off), idle);
}

namespace {

struct RecordColumn {
  std::size_t number = 0;
  UnitReader::Scale scale;
};

/// {"column": .., "unit": ..} against a table's header; no unit where the measure is none.
std::optional<RecordColumn> read_column(ObjectReader& reader, const char* key,
                                        const CsvTable& table, std::optional<Measure> measure) {
  auto column = reader.object(key, Need::required);
  if (!column) return std::nullopt;
  RecordColumn result;
  bool fine = true;
  if (const auto name = column->text("column", Need::required)) {
    if (const auto number = table.column(*name)) {
      result.number = *number;
    } else {
      column->fault("column", "\"" + *name + "\"",
                    fmt::format("{} has no such column", table.name()),
                    name_hint(*name, table.header()));
      fine = false;
    }
  } else {
    fine = false;
  }
  if (measure) {
    if (const auto unit = column->text("unit", Need::required)) {
      std::string problem;
      const auto scale = reader.context().units.scale_of(*unit, *measure, problem);
      if (scale) {
        result.scale = *scale;
      } else {
        column->fault("unit", "\"" + *unit + "\"", problem,
                      fmt::format("Write one of {}.", example_units(*measure)));
        fine = false;
      }
    } else {
      fine = false;
    }
  }
  column->finish();
  return fine ? std::optional(result) : std::nullopt;
}

}  // namespace

std::optional<Timeline> read_record(ObjectReader& reader, std::optional<Measure> measure) {
  FaultList& faults = reader.context().faults;
  const std::size_t n_before = faults.all().size();
  const auto path = reader.text("csv", Need::required);
  const auto table =
      path ? CsvTable::read(reader.context().document.folder() / *path, faults) : std::nullopt;
  if (!table) {
    (void)reader.raw("time");
    (void)reader.raw("value");
    reader.finish();
    return std::nullopt;
  }
  const auto time = read_column(reader, "time", *table, Measure::duration);
  const auto value = read_column(reader, "value", *table, measure);
  reader.finish();
  if (!time || !value) return std::nullopt;

  struct Row {
    double time;
    double value;
    int line;
  };
  std::vector<Row> rows;
  std::size_t n_missing = 0;
  for (std::size_t i = 0; i < table->n_rows(); ++i) {
    const auto t = table->number(i, time->number, faults);
    const auto v = table->number(i, value->number, faults);
    if (!t || !v) {
      ++n_missing;
      continue;
    }
    rows.push_back({time->scale.scale * *t + time->scale.offset,
                    value->scale.scale * *v + value->scale.offset, table->line(i)});
  }
  const auto earlier = [](const Row& a, const Row& b) { return a.time < b.time; };
  const auto note = [&](const std::string& text) {
    if (reader.context().notes != nullptr) {
      reader.context().notes->push_back(table->name() + ": " + text);
    }
  };
  if (n_missing > 0) {
    note(fmt::format("{} of {} rows have no time or no value; the row before holds on", n_missing,
                     table->n_rows()));
  }
  if (!std::is_sorted(rows.begin(), rows.end(), earlier)) {
    note("the rows are not in time order; they were sorted");
  }
  std::stable_sort(rows.begin(), rows.end(), earlier);
  if (!rows.empty() && rows.front().time > 0.0) {
    note(fmt::format("the record starts at {:g} d; its first value is taken before that too",
                     rows.front().time));
  }
  for (std::size_t i = 1; i < rows.size(); ++i) {
    if (rows[i].time > rows[i - 1].time) continue;
    faults.add({.file = table->name(),
                .line = std::max(rows[i].line, rows[i - 1].line),
                .found = fmt::format("the time of line {} again",
                                     std::min(rows[i].line, rows[i - 1].line)),
                .allowed = "each time of a record stands once",
                .way_out = "Take one of the two rows out."});
  }
  if (rows.empty() && faults.all().size() == n_before) {
    reader.fault("csv", "\"" + *path + "\"", "no row has both a time and a value",
                 "Check the columns.");
  }
  if (faults.all().size() > n_before) return std::nullopt;
  std::vector<double> times;
  std::vector<double> values;
  for (const Row& row : rows) {
    times.push_back(row.time);
    values.push_back(row.value);
  }
  return Timeline::steps(std::move(times), std::move(values));
}

}  // namespace stillzone::core
