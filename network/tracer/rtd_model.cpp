#include "network/tracer/rtd_model.hpp"

#include <algorithm>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <utility>

#include "core/require.hpp"
#include "network/tracer/rtd_candidates.hpp"

namespace stillzone::network {
namespace {

/// What a candidate is called and where it comes from.
struct Description {
  std::string_view name;
  std::string_view meaning;
  std::string_view source;
};

/// A parameter with the factor that makes it dimensionless (1, 1/V or 1/Q).
struct ScaledParameter {
  RtdParameter parameter;
  double scale = 1.0;
};

/// Gives a dimensionless candidate the user's parameters and units.
template <class Candidate>
class CandidateModel : public RtdModel {
 public:
  static constexpr std::size_t n = Candidate::n;
  CandidateModel(Description description, const std::array<ScaledParameter, n>& parameters)
      : description_(description) {
    for (std::size_t j = 0; j < n; ++j) {
      parameters_.push_back(parameters[j].parameter);
      scale_[j] = parameters[j].scale;
    }
  }
  [[nodiscard]] std::string_view name() const override { return description_.name; }
  [[nodiscard]] std::string_view meaning() const override { return description_.meaning; }
  [[nodiscard]] std::string_view source() const override { return description_.source; }
  [[nodiscard]] std::span<const RtdParameter> parameters() const override { return parameters_; }

  void settle_names(std::span<double> p) const override {
    if constexpr (requires { Candidate::settle_names(p); }) Candidate::settle_names(p);
  }
  double step_response(std::span<const double> p, double theta,
                       std::span<double> gradient) const override {
    if (theta < 0.0) return unpack(core::Dual<double, n>(0.0), gradient);
    return unpack(Candidate::step(pack(p), theta), gradient);
  }
  double density(std::span<const double> p, double theta,
                 std::span<double> gradient) const override {
    if (theta < 0.0) return unpack(core::Dual<double, n>(0.0), gradient);
    return unpack(Candidate::density(pack(p), theta), gradient);
  }
  [[nodiscard]] std::vector<RtdImpulse> impulses(std::span<const double> p) const override {
    std::vector<RtdImpulse> result;
    for (const auto& [theta, share] : Candidate::impulses(pack(p))) {
      result.push_back({.theta = theta,
                        .share = share.value,
                        .share_gradient = {share.d.begin(), share.d.end()}});
    }
    return result;
  }
  double transform(std::span<const double> p, double s, std::span<double> gradient) const override {
    return unpack(Candidate::transform(pack(p), core::Dual<double, n>(s)), gradient);
  }
  [[nodiscard]] double mean(std::span<const double> p) const override {
    return Candidate::mean(pack(p)).value;
  }
  [[nodiscard]] double variance(std::span<const double> p) const override {
    return Candidate::variance(pack(p)).value;
  }

 private:
  [[nodiscard]] std::array<core::Dual<double, n>, n> pack(std::span<const double> p) const {
    SZ_REQUIRE(p.size() == n, "{} parameters for {}", p.size(), description_.name);
    std::array<core::Dual<double, n>, n> packed;
    for (std::size_t j = 0; j < n; ++j) {
      packed[j] = core::Dual<double, n>::variable(p[j] * scale_[j], j, scale_[j]);
    }
    return packed;
  }
  static double unpack(const core::Dual<double, n>& value, std::span<double> gradient) {
    for (std::size_t j = 0; j < gradient.size(); ++j) gradient[j] = value.d[j];
    return value.value;
  }

  Description description_;
  std::vector<RtdParameter> parameters_;
  std::array<double, n> scale_{};
};

/// The parameters of all candidates, in the units of one digester.
class ParameterSet {
 public:
  ParameterSet(double volume, double flow) : volume_(volume), flow_(flow) {}
  [[nodiscard]] ScaledParameter volume() const {
    return {{"volume", "m3", "volume that takes part in the flow", volume_, 0.02 * volume_,
             3.0 * volume_},
            1.0 / volume_};
  }
  [[nodiscard]] static ScaledParameter tanks() {
    return {{"tanks", "1", "number of equal tanks in series, a real number", 1.5, 0.2, 100.0}, 1.0};
  }
  [[nodiscard]] static ScaledParameter mixed_fraction() {
    return {{"mixed_fraction", "1", "well-mixed share of the nominal volume", 0.8, 0.01, 0.9999},
            1.0};
  }
  [[nodiscard]] static ScaledParameter mixed_fraction_with_dead() {
    return {{"mixed_fraction", "1", "well-mixed share of the nominal volume, the rest dead", 0.8,
             0.01, 3.0},
            1.0};
  }
  [[nodiscard]] static ScaledParameter bypass_fraction() {
    return {{"bypass_fraction", "1", "share of the feed that leaves at once", 0.05, 0.0, 0.95},
            1.0};
  }
  [[nodiscard]] ScaledParameter exchange_flow() const {
    return {{"exchange_flow", "m3/d", "exchange between mixed and stagnant zone", 0.3 * flow_,
             1e-4 * flow_, 100.0 * flow_},
            1.0 / flow_};
  }
  [[nodiscard]] static ScaledParameter plug_fraction() {
    return {{"plug_fraction", "1", "share of the volume passed without mixing", 0.05, 0.0, 0.98},
            1.0};
  }
  [[nodiscard]] static ScaledParameter fast_flow_fraction() {
    return {{"fast_flow_fraction", "1", "share of the flow on the fast path", 0.3, 0.001, 0.999},
            1.0};
  }
  [[nodiscard]] static ScaledParameter fast_volume_fraction() {
    return {
        {"fast_volume_fraction", "1", "share of the volume on the fast path", 0.1, 0.001, 0.999},
        1.0};
  }
  [[nodiscard]] static ScaledParameter peclet() {
    return {{"peclet", "1", "Peclet number u L / D between closed ends", 3.0, 0.01, 300.0}, 1.0};
  }

 private:
  double volume_;
  double flow_;
};

template <class Candidate>
std::unique_ptr<const RtdModel> made(Description description,
                                     const std::array<ScaledParameter, Candidate::n>& parameters) {
  return std::make_unique<CandidateModel<Candidate>>(description, parameters);
}

}  // namespace

std::vector<std::string> rtd_model_names() {
  return {"one_tank",        "tanks_in_series", "bypass_dead",    "stagnant_exchange",
          "series_stagnant", "plug_tank",       "parallel_paths", "dispersion"};
}

std::unique_ptr<const RtdModel> make_rtd_model(std::string_view name, core::Volume nominal_volume,
                                               core::FlowRate nominal_flow) {
  namespace c = candidates;
  const ParameterSet p(nominal_volume.value(), nominal_flow.value());
  if (name == "one_tank") {
    return made<c::OneTank>({"one_tank", "one well-mixed tank", "Danckwerts (1953)"}, {p.volume()});
  }
  if (name == "tanks_in_series") {
    return made<c::TanksInSeries>(
        {"tanks_in_series", "equal tanks in series", "MacMullin and Weber (1935)"},
        {p.volume(), ParameterSet::tanks()});
  }
  if (name == "bypass_dead") {
    return made<c::BypassDead>(
        {"bypass_dead", "mixed tank with a bypass and dead volume", "Cholette and Cloutier (1959)"},
        {ParameterSet::mixed_fraction_with_dead(), ParameterSet::bypass_fraction()});
  }
  if (name == "stagnant_exchange") {
    return made<c::StagnantExchange>(
        {"stagnant_exchange", "mixed zone that exchanges with a stagnant zone",
         "two-region model, Levenspiel (1999) ch. 12"},
        {ParameterSet::mixed_fraction(), p.exchange_flow()});
  }
  if (name == "series_stagnant") {
    return made<c::SeriesStagnant>(
        {"series_stagnant", "tanks in series, each with a stagnant zone",
         "two-region model in series, Levenspiel (1999) ch. 12"},
        {ParameterSet::tanks(), ParameterSet::mixed_fraction(), p.exchange_flow()});
  }
  if (name == "plug_tank") {
    return made<c::PlugTank>({"plug_tank", "a plug section, then a mixed tank", "standard"},
                             {p.volume(), ParameterSet::plug_fraction()});
  }
  if (name == "parallel_paths") {
    return made<c::ParallelPaths>(
        {"parallel_paths", "a fast and a slow mixed tank side by side", "standard"},
        {p.volume(), ParameterSet::fast_flow_fraction(), ParameterSet::fast_volume_fraction()});
  }
  if (name == "dispersion") {
    return made<c::Dispersion>({"dispersion", "axial dispersion between closed ends",
                                "Danckwerts (1953); Wehner and Wilhelm (1956)"},
                               {p.volume(), ParameterSet::peclet()});
  }
  return nullptr;
}

double quantile(const RtdModel& model, std::span<const double> p, double share) {
  SZ_REQUIRE(share > 0.0 && share < 1.0, "share {}", share);
  const auto excess = [&](double theta) { return model.step_response(p, theta, {}) - share; };
  if (excess(0.0) >= 0.0) return 0.0;
  double high = std::max(model.mean(p), 1e-6);
  double low = 0.0;
  while (excess(high) < 0.0 && high < 1e8) {
    low = high;
    high *= 2.0;
  }
  std::uintmax_t most = 200;
  const auto [a, b] = boost::math::tools::toms748_solve(
      excess, low, high, boost::math::tools::eps_tolerance<double>(50), most);
  return 0.5 * (a + b);
}

}  // namespace stillzone::network
