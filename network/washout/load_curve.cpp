#include "network/washout/load_curve.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <memory>
#include <utility>

#include "core/continuation/continuation.hpp"
#include "core/dae/steady_state.hpp"
#include "network/start_state.hpp"
#include "network/washout/curve_values.hpp"
#include "network/washout/transport_criterion.hpp"

namespace stillzone::network {

namespace {

/// Loads at which a healthy state is sought, nearest to today first.
constexpr double kStartLoads[] = {1.0, 0.85, 0.7, 0.55, 0.4, 0.3, 0.2, 0.1};
/// The state beyond is sought by time integration at this multiple of the critical load.
constexpr double kJustBeyond = 1.02;
/// The branch beyond is followed up to this multiple of the critical load.
constexpr double kFarBeyond = 1.5;
constexpr int kMostSecantSteps = 60;
constexpr double kSourPh = 6.5;  ///< common practice, no source
constexpr double kSourVfaTimes = 10.0;

std::size_t count(const std::vector<bool>& lives) {
  return static_cast<std::size_t>(std::ranges::count(lives, true));
}

class Tracer {
 public:
  Tracer(const Case& the_case, const FlowBalance& balance, const LoadFlows& flows,
         const CurveOptions& options)
      : case_(the_case),
        options_(options),
        flows_(flows),
        loaded_(the_case, balance, flows),
        solver_(core::make_klu_solver(loaded_.digester().pattern())),
        continuation_(loaded_, *solver_, {}),
        values_(the_case, loaded_, options.most_unknowns_for_stability) {}

  core::Result<LoadCurve> run();

 private:
  core::Result<core::Done> find_start();
  core::Result<std::vector<double>> settle(std::vector<double> y, double load);
  void follow_down(std::span<const double> y, double load, std::vector<CurvePoint>& points);
  void follow_up(std::span<const double> y, double load);
  void follow_past_fold(core::BranchPoint from);
  void take_fold(const core::BranchPoint& fold);
  void take_washout(const core::BranchPoint& before, const core::BranchPoint& after,
                    std::size_t group);
  std::pair<double, std::vector<double>> locate_washout(const core::BranchPoint& before,
                                                        const core::BranchPoint& after,
                                                        std::size_t group);
  void add_today(const core::BranchPoint& before, const core::BranchPoint& after);
  [[nodiscard]] std::optional<std::size_t> lost_group(const core::BranchPoint& before,
                                                      const core::BranchPoint& after) const;
  void look_beyond();
  void find_half_treatment();
  void find_souring();
  void tell_folds();
  void add(std::vector<CurvePoint>& points, std::span<const double> y, double load);

  const Case& case_;
  const CurveOptions& options_;
  const LoadFlows& flows_;
  LoadedDigester loaded_;
  std::unique_ptr<core::LinearSolver> solver_;
  core::Continuation continuation_;
  CurveValues values_;
  LoadCurve curve_;
  std::vector<double> healthy_;       // state at curve_.start_load
  std::vector<bool> lives_;           // groups there
  bool healthy_sour_ = false;         // its pH is below kSourPh: no better one was found
  std::vector<double> last_stable_;   // last state before the critical load
  std::vector<double> last_tangent_;  // its direction along the branch
};

void Tracer::add(std::vector<CurvePoint>& points, std::span<const double> y, double load) {
  points.push_back(values_.point(y, load));
  if (options_.progress) options_.progress(load);
}

/// The steady state that time integration from y settles to.
core::Result<std::vector<double>> Tracer::settle(std::vector<double> y, double load) {
  loaded_.set_parameter(load);
  if (auto done = loaded_.digester().make_consistent(y); !done) return done.failure();
  auto report = core::find_steady_state(loaded_.digester(), *solver_, {}, y);
  if (!report) return report.failure();
  return y;
}

core::Result<core::Done> Tracer::find_start() {
  std::optional<core::Failure> failure;
  std::vector<bool> todays_lives;
  for (const double load : kStartLoads) {
    if (!flows_.possible(load)) break;
    loaded_.set_parameter(load);
    auto start = start_state(case_, loaded_.digester());
    if (!start) return start.failure();
    auto found = settle(std::move(start).value(), load);
    if (!found) {
      if (!failure) failure = found.failure();
      continue;
    }
    std::vector<bool> lives = values_.living(found.value(), load);
    const CurvePoint point = values_.point(found.value(), load);
    const bool sour = point.ph < kSourPh;
    if (load >= 1.0) {
      curve_.today = point;
      todays_lives = lives;
    }
    const bool better = count(lives) > count(lives_) || (healthy_sour_ && !sour);
    if (healthy_.empty() || (better && count(lives) >= count(lives_))) {
      healthy_sour_ = sour;
      healthy_ = std::move(found).value();
      lives_ = std::move(lives);
      curve_.start_load = load;
    }
    if (count(lives_) == lives_.size() && !healthy_sour_) break;
  }
  if (healthy_.empty()) return *failure;
  const CurvePoint healthy = values_.point(healthy_, curve_.start_load);
  if (curve_.today) {
    curve_.today_is = name_state(case_, *curve_.today, todays_lives,
                                 curve_.start_load < 1.0 ? &healthy : nullptr, lives_);
  } else {
    curve_.today_is = "not found";
    curve_.notes.push_back("no steady state was found at today's load: " + failure->text());
  }
  return core::Done{};
}

void Tracer::follow_down(std::span<const double> y, double load, std::vector<CurvePoint>& points) {
  auto at = continuation_.start(y, load, -1.0);
  while (at && points.size() < options_.most_points) {
    auto next = continuation_.advance(at.value());
    if (!next) break;
    const core::BranchPoint& to = next.value();
    const bool turned = to.tangent_parameter >= 0.0;
    if (turned || to.parameter < options_.lowest_load || !flows_.possible(to.parameter)) break;
    if (lost_group(at.value(), to)) break;
    add(points, to.y, to.parameter);
    at = std::move(next);
  }
}

/// A group whose biomass goes from above 0 to 0 or below; of several the first along the way.
std::optional<std::size_t> Tracer::lost_group(const core::BranchPoint& before,
                                              const core::BranchPoint& after) const {
  std::optional<std::size_t> lost;
  double earliest = 2.0;
  const auto& groups = case_.kinetics.groups;
  for (std::size_t g = 0; g < groups.size(); ++g) {
    const double had = values_.mean_of(before.y, groups[g].component);
    const double has = values_.mean_of(after.y, groups[g].component);
    if (had <= 0.0 || has > 0.0 || !lives_[g]) continue;
    const double share = had / (had - has);
    if (share >= earliest) continue;
    earliest = share;
    lost = g;
  }
  return lost;
}

void Tracer::follow_up(std::span<const double> y, double load) {
  auto start = continuation_.start(y, load, 1.0);
  if (!start) {
    curve_.end = CurveEnd::given_up;
    curve_.notes.push_back(start.failure().text());
    return;
  }
  core::BranchPoint at = std::move(start).value();
  while (curve_.points.size() < options_.most_points) {
    auto next = continuation_.advance(at);
    if (!next) {
      curve_.end = CurveEnd::given_up;
      curve_.notes.push_back("the branch was followed to load " +
                             fmt::format("{:.6g}: ", at.parameter) + next.failure().text());
      return;
    }
    core::BranchPoint& to = next.value();
    last_stable_ = at.y;
    if (to.tangent_parameter <= 0.0) {
      auto fold = continuation_.locate_fold(at, to, continuation_.last_step());
      if (fold) {
        const auto lost = lost_group(at, fold.value());
        if (!lost) {
          take_fold(fold.value());
          return follow_past_fold(std::move(to));
        }
      }
    }
    if (const auto group = lost_group(at, to)) return take_washout(at, to, *group);
    if (to.parameter > options_.highest_load) return;
    if (to.tangent_parameter <= 0.0) {
      curve_.end = CurveEnd::given_up;
      curve_.notes.push_back("a fold was passed but not located");
      return;
    }
    add(curve_.points, to.y, to.parameter);
    at = std::move(to);
  }
  curve_.notes.push_back("the curve was cut at its largest number of points");
}

void Tracer::take_fold(const core::BranchPoint& fold) {
  curve_.end = CurveEnd::fold;
  curve_.critical_load = fold.parameter;
  curve_.folds.push_back(fold.parameter);
  double fastest = 0.0;
  const auto& groups = case_.kinetics.groups;
  for (std::size_t g = 0; g < groups.size(); ++g) {
    if (!lives_[g]) continue;
    const double change = values_.mean_of(fold.tangent, groups[g].component) /
                          values_.mean_of(fold.y, groups[g].component);
    if (change >= fastest) continue;
    fastest = change;
    curve_.first_to_fail = g;
  }
  add(curve_.points, fold.y, fold.parameter);
}

/// The part of the branch past the fold, back to lower loads, until a group's biomass is 0 there.
void Tracer::follow_past_fold(core::BranchPoint from) {
  core::BranchPoint at = std::move(from);
  add(curve_.points, at.y, at.parameter);
  while (curve_.points.size() < options_.most_points) {
    auto next = continuation_.advance(at);
    if (!next) break;
    core::BranchPoint& to = next.value();
    if (to.parameter < options_.lowest_load || to.parameter > options_.highest_load ||
        !flows_.possible(to.parameter)) {
      break;
    }
    if (to.tangent_parameter * at.tangent_parameter < 0.0) {
      if (auto fold = continuation_.locate_fold(at, to, continuation_.last_step())) {
        curve_.folds.push_back(fold.value().parameter);
        add(curve_.points, fold.value().y, fold.value().parameter);
      }
    }
    if (const auto group = lost_group(at, to)) {
      const auto [load, y] = locate_washout(at, to, *group);
      curve_.return_load = load;
      if (at.parameter > 1.0 && load < 1.0) add_today(at, to);
      if (!y.empty()) add(curve_.points, y, load);
      break;
    }
    if (at.parameter > 1.0 && to.parameter < 1.0) add_today(at, to);
    add(curve_.points, to.y, to.parameter);
    at = std::move(to);
  }
}

/// The state of this part of the branch at today's load exactly.
void Tracer::add_today(const core::BranchPoint& before, const core::BranchPoint& after) {
  const double share = (before.parameter - 1.0) / (before.parameter - after.parameter);
  std::vector<double> y = before.y;
  for (std::size_t i = 0; i < y.size(); ++i) y[i] += share * (after.y[i] - before.y[i]);
  if (continuation_.correct(1.0, y)) add(curve_.points, y, 1.0);
}

/// The load at which the group can just no longer invade its own washed-out state (its biomass 0 in
/// all zones), and that state: the root of its invasion rate along it, by the secant method. The
/// state is empty when the load is only interpolated between the two points.
std::pair<double, std::vector<double>> Tracer::locate_washout(const core::BranchPoint& before,
                                                              const core::BranchPoint& after,
                                                              std::size_t group) {
  const std::size_t component = case_.kinetics.groups[group].component;
  const StateLayout& layout = loaded_.digester().layout();
  std::vector<double> y = before.y;
  std::vector<double> held(y.size(), 0.0);
  for (std::size_t z = 0; z < layout.n_zones(); ++z) {
    y[layout.in_zone(z, component)] = 0.0;
    held[layout.in_zone(z, component)] = 1.0;
  }
  const double had = values_.mean_of(before.y, component);
  const double has = values_.mean_of(after.y, component);
  const double guess = before.parameter + (after.parameter - before.parameter) * had / (had - has);
  const auto streams = loaded_.digester().operation().balance().streams();
  const auto invasion = [&](double load) -> std::optional<double> {
    if (!continuation_.correct(load, y, held)) return std::nullopt;
    const auto matrix = transport_matrix(case_, streams, loaded_.point().rates);
    const auto found = group_invasion(loaded_.digester(), matrix, y, component);
    return found ? std::optional(found->rate) : std::nullopt;
  };
  double a = guess * (1.0 - 1e-4);
  double b = guess;
  auto at_a = invasion(a);
  auto at_b = invasion(b);
  bool located = false;
  for (int k = 0; at_a && at_b && k < kMostSecantSteps && !located; ++k) {
    const double slope = (*at_b - *at_a) / (b - a);
    const double next = b - *at_b / slope;
    if (!std::isfinite(next) || std::abs(next / guess - 1.0) > 0.5) break;
    a = b;
    at_a = at_b;
    b = next;
    located = std::abs(b - a) <= 1e-13 * std::abs(b);
    at_b = invasion(b);
  }
  if (!located || !at_b) {
    curve_.notes.push_back(
        fmt::format("the load {:.4g} at which {} are washed out is interpolated between two points "
                    "of the branch",
                    guess, case_.kinetics.groups[group].name));
    return {guess, {}};
  }
  return {b, y};
}

void Tracer::take_washout(const core::BranchPoint& before, const core::BranchPoint& after,
                          std::size_t group) {
  const auto [load, y] = locate_washout(before, after, group);
  curve_.end = CurveEnd::washout;
  curve_.first_to_fail = group;
  curve_.critical_load = load;
  if (!y.empty()) add(curve_.points, y, load);
}

/// Where time goes when the load is raised past the critical one, and that branch both ways.
void Tracer::look_beyond() {
  if (!curve_.critical_load || last_stable_.empty()) return;
  const double load = kJustBeyond * *curve_.critical_load;
  auto settled = settle(last_stable_, load);
  if (!settled) {
    curve_.state_beyond = "not settled (see the notes)";
    curve_.notes.push_back("just beyond the critical load: " + settled.failure().text());
    return;
  }
  std::vector<double> y = std::move(settled).value();
  const std::vector<bool> lives = values_.living(y, load);
  const CurvePoint point = values_.point(y, load);
  const CurvePoint healthy = values_.point(healthy_, curve_.start_load);
  curve_.state_beyond = name_state(case_, point, lives, &healthy, lives_);
  const std::vector<bool> lived = std::exchange(lives_, lives);
  std::vector<CurvePoint> down;
  follow_down(y, load, down);
  curve_.beyond.assign(down.rbegin(), down.rend());
  curve_.beyond.push_back(point);
  auto at = continuation_.start(y, load, 1.0);
  while (at && curve_.beyond.size() < 2 * options_.most_points) {
    auto next = continuation_.advance(at.value());
    if (!next || next.value().parameter > kFarBeyond * *curve_.critical_load ||
        next.value().tangent_parameter <= 0.0 || lost_group(at.value(), next.value())) {
      break;
    }
    add(curve_.beyond, next.value().y, next.value().parameter);
    at = std::move(next);
  }
  lives_ = lived;
}

void Tracer::find_half_treatment() {
  constexpr double kSome = 1e-6;  // less is rounding: a model that keeps its COD in the water
  if (!curve_.today || curve_.start_load < 1.0 || !(curve_.today->cod_removed > kSome)) return;
  const double half = 0.5 * curve_.today->cod_removed;
  for (std::size_t k = 1; k < curve_.points.size(); ++k) {
    const CurvePoint& a = curve_.points[k - 1];
    const CurvePoint& b = curve_.points[k];
    if (b.load < a.load) break;  // past a fold
    if (b.load <= 1.0 || a.cod_removed < half || b.cod_removed >= half) continue;
    const double share = (a.cod_removed - half) / (a.cod_removed - b.cod_removed);
    curve_.half_treatment_load = a.load + share * (b.load - a.load);
    return;
  }
}

void Tracer::find_souring() {
  for (std::size_t k = 1; k < curve_.points.size(); ++k) {
    const CurvePoint& a = curve_.points[k - 1];
    const CurvePoint& b = curve_.points[k];
    if (b.load < a.load) return;  // past a fold
    if (!(a.ph >= kSourPh && b.ph < kSourPh)) continue;
    curve_.sour_load = a.load + (a.ph - kSourPh) / (a.ph - b.ph) * (b.load - a.load);
    return;
  }
}

/// A branch that turns again past its first fold.
void Tracer::tell_folds() {
  if (curve_.folds.size() < 3) return;
  const double highest = *std::ranges::max_element(curve_.folds);
  curve_.notes.push_back(fmt::format(
      "past its first fold at load {:.5g} the branch turns again ({} folds in all): zones fail one "
      "after another{}",
      curve_.folds.front(), curve_.folds.size(),
      highest > curve_.folds.front() * (1.0 + 1e-9)
          ? fmt::format(", and a weakened state is stable up to load {:.5g}", highest)
          : std::string()));
}

core::Result<LoadCurve> Tracer::run() {
  if (auto found = find_start(); !found) return found.failure();
  if (case_.kinetics.groups.empty()) {
    curve_.notes.emplace_back(
        "the kinetic model names no microbial groups: there is nothing to wash out, only a curve");
  } else if (count(lives_) == 0) {
    curve_.end = CurveEnd::nothing_lives;
    curve_.notes.push_back(
        "no microbial group lives at any load tried from this start: there is no healthy branch to "
        "follow; start \"seeded\" gives the model's inoculum");
    add(curve_.points, healthy_, curve_.start_load);
    return curve_;
  }
  std::vector<CurvePoint> down;
  follow_down(healthy_, curve_.start_load, down);
  curve_.points.assign(down.rbegin(), down.rend());
  add(curve_.points, healthy_, curve_.start_load);
  follow_up(healthy_, curve_.start_load);
  find_half_treatment();
  find_souring();
  look_beyond();
  tell_folds();
  return curve_;
}

}  // namespace

std::string name_state(const Case& the_case, const CurvePoint& point,
                       const std::vector<bool>& lives, const CurvePoint* healthy,
                       const std::vector<bool>& healthy_lives) {
  std::string lost;
  const auto& groups = the_case.kinetics.groups;
  for (std::size_t g = 0; g < groups.size(); ++g) {
    if (lives[g] || (healthy != nullptr && !healthy_lives[g])) continue;
    lost += (lost.empty() ? "" : ", ") + groups[g].name;
  }
  const bool acid = point.ph < kSourPh;  // false when the model has no pH
  const bool vfa = healthy != nullptr && point.vfa > kSourVfaTimes * healthy->vfa;
  std::string name = lost.empty() ? "" : "washed out: " + lost;
  if (acid || vfa) {
    std::string sour = "soured";
    if (acid) sour += fmt::format(" (pH {:.2f})", point.ph);
    if (vfa) sour += fmt::format(" (VFA {:.3g})", point.vfa);
    name += (name.empty() ? "" : "; ") + sour;
  }
  return name.empty() ? "healthy" : name;
}

core::Result<LoadCurve> trace_load_curve(const Case& the_case, const FlowBalance& balance,
                                         const CurveOptions& options) {
  const auto flows = LoadFlows::of(the_case, balance);
  if (!flows) {
    return core::Failure{
        .reason =
            "the flows of this case do not follow the feeds: with given flows kept or scaled, "
            "continuity fails at half or at twice the feed",
        .try_this =
            "Leave out one given flow per way through, or give shares, so that continuity "
            "can find the flow at any feed."};
  }
  auto curve = Tracer(the_case, balance, *flows, options).run();
  if (curve) curve.value().notes.insert(curve.value().notes.begin(), flows->rule());
  return curve;
}

}  // namespace stillzone::network
