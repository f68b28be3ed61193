#pragma once

#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "core/result.hpp"
#include "network/case.hpp"
#include "network/flow_balance.hpp"

namespace stillzone::network {

/// A steady state at a load, as an operator sees it.
struct CurvePoint {
  double load = 1.0;          ///< 1 = today
  double hrt_d = 0.0;         ///< [d] volume of all zones over all feed flow
  double methane_flow = 0.0;  ///< [m3/d] 0 degC, 1.01325 bar, all headspaces
  double vfa = 0.0;           ///< the model's VFA in the effluent, its unit; NaN: it has none
  double ph = 0.0;            ///< in the effluent of the largest outlet; NaN: the model has none
  double effluent_cod = 0.0;  ///< [kg COD/m3] all outlets mixed
  double cod_removed = 0.0;  ///< share of the feed's COD that leaves as gas or is lost in the model
  std::optional<bool> stable;  ///< none: not worked out
  /// [1/d] minus the real part of the dominant eigenvalue; none: not worked out
  std::optional<double> recovery_rate;
  std::vector<double> biomass;  ///< one per group of the model, mean over all zones, its unit
  std::vector<double> y;        ///< the state
};

enum class CurveEnd {
  none,          ///< followed to the highest load asked for
  fold,          ///< the steady state ends: a fold of the branch
  washout,       ///< a group's biomass reaches 0: its washed-out state takes over
  given_up,      ///< the branch could not be followed further
  nothing_lives  ///< no group lives at any load tried
};

/// Steady states against load, from the healthy state nearest to today.
struct LoadCurve {
  /// In the order of the branch: low load, today, critical load, and past a fold back to lower
  /// loads along the unstable part.
  std::vector<CurvePoint> points;
  /// States on the other side of the critical load, in order of rising load: stable ones found by
  /// time integration from just before the critical load, and followed both ways.
  std::vector<CurvePoint> beyond;
  CurveEnd end = CurveEnd::none;
  std::optional<double> critical_load;
  /// Loads of the folds in the order of the branch; the first is the critical load. More than one:
  /// the network fails in steps (one zone before another).
  std::vector<double> folds;
  /// Past a fold: the load at which the unstable part of the branch meets the washed-out state of a
  /// group. Between it and the critical load both states are stable: once failed, a digester comes
  /// back from a few cells only below it. None: no fold, or the branch does not get there.
  std::optional<double> return_load;
  /// Group that is lost first: at a washout the one whose biomass reaches 0, at a fold the one
  /// whose biomass falls fastest in proportion along the branch.
  std::optional<std::size_t> first_to_fail;
  /// What the state beyond the critical load is, by the rules of name_state.
  std::string state_beyond;
  /// Load > today's at which the share of COD removed is half of today's; none: not on the curve.
  std::optional<double> half_treatment_load;
  /// Load at which the effluent's pH falls through 6.5 (common practice, no source) on the way up
  /// the healthy branch: a network can sour zone by zone without a fold. None: it does not.
  std::optional<double> sour_load;
  std::optional<CurvePoint> today;  ///< the steady state at load 1 from the case's start
  std::string today_is;             ///< by the rules of name_state
  double start_load = 1.0;          ///< where the healthy branch was entered
  std::vector<std::string> notes;
};

struct CurveOptions {
  double lowest_load = 0.2;    ///< > 0, < 1
  double highest_load = 50.0;  ///< > 1
  /// Beyond this many differential unknowns stability is not worked out.
  std::size_t most_unknowns_for_stability = 220;
  std::size_t most_points = 400;
  std::function<void(double load)> progress{};
};

/// Names a steady state. A group lives where more of it leaves than is fed and somewhere stands
/// above its floor. "healthy": every group lives; "washed out: GROUPS": those that do not live but
/// do in `healthy`; "soured" is added when the model's pH is below 6.5 (common practice, no source)
/// or VFA is over ten times that of `healthy`.
[[nodiscard]] std::string name_state(const Case& the_case, const CurvePoint& point,
                                     const std::vector<bool>& lives, const CurvePoint* healthy,
                                     const std::vector<bool>& healthy_lives);

/// Traces the load curve of a case (flows by LoadFlows). Failure: no steady state at any load
/// tried, or flows that do not scale.
[[nodiscard]] core::Result<LoadCurve> trace_load_curve(const Case& the_case,
                                                       const FlowBalance& balance,
                                                       const CurveOptions& options);

}  // namespace stillzone::network
