#include "network/tracer/network_residence.hpp"

#include <cmath>
#include <limits>
#include <utility>

#include "core/require.hpp"

namespace stillzone::network {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

class NetworkResidence final : public RtdModel {
 public:
  NetworkResidence(std::shared_ptr<const WaterNetwork> network, std::size_t feed,
                   double days_per_turnover, std::string name, std::vector<RtdParameter> parameters)
      : network_(std::move(network)),
        feed_(feed),
        days_(days_per_turnover),
        name_(std::move(name)),
        parameters_(std::move(parameters)) {}

  [[nodiscard]] std::string_view name() const override { return name_; }
  [[nodiscard]] std::string_view meaning() const override { return network_->water().title; }
  [[nodiscard]] std::string_view source() const override { return "the user's own network"; }
  [[nodiscard]] std::span<const RtdParameter> parameters() const override { return parameters_; }

  double step_response(std::span<const double> p, double theta,
                       std::span<double> gradient) const override {
    // A step of 1 g/m3 in the feed, seen in all outlets together.
    const NetworkDose dose{.concentration = 1.0, .until = std::numeric_limits<double>::infinity()};
    return theta < 0.0 ? nothing(gradient) : seen(p, theta, dose, gradient);
  }
  double density(std::span<const double> p, double theta,
                 std::span<double> gradient) const override {
    if (theta < 0.0) return nothing(gradient);
    // One gram at once: its outflow [g/d] is E per day.
    const WaterSystem system = system_of(p);
    DoseHistory history(system, injection(), {.mass = 1.0}, !gradient.empty());
    history.advance(theta * days_);
    double sum = 0.0;
    for (std::size_t o = 0; o < n_outlets(); ++o) {
      const double flow = system.at.outlet[static_cast<Index>(o)];
      sum += flow * history.outlet(o);
      for (std::size_t j = 0; j < gradient.size(); ++j) {
        if (o == 0) gradient[j] = 0.0;
        gradient[j] += days_ * (flow * history.outlet_slope(o, j) +
                                system.slope[j].outlet[static_cast<Index>(o)] * history.outlet(o));
      }
    }
    return sum * days_;
  }
  [[nodiscard]] std::vector<RtdImpulse> impulses(std::span<const double> p) const override {
    const WaterSystem system = system_of(p);
    const auto f = static_cast<Index>(feed_);
    const double share = system.at.feed_to_outlet.row(f).sum() / system.at.feed[f];
    if (!(share > 0.0)) return {};
    RtdImpulse impulse{.theta = 0.0, .share = share, .share_gradient = {}};
    for (const WaterSystem::Part& slope : system.slope) {
      impulse.share_gradient.push_back((slope.feed_to_outlet.row(f).sum() - share * slope.feed[f]) /
                                       system.at.feed[f]);
    }
    return {impulse};
  }
  double transform(std::span<const double> p, double s, std::span<double> gradient) const override {
    const WaterSystem system = system_of(p);
    const double rate = s / days_;
    const auto f = static_cast<Index>(feed_);
    const Index n = system.at.volume.size();
    const VectorXd outflow = system.at.zone_to_outlet.rowwise().sum();
    // Per gram: zones hold x = (s I - A)^-1 e, the outlets take outflow . x.
    const MatrixXd matrix = rate * MatrixXd::Identity(n, n) - system.at.transport;
    const Eigen::PartialPivLU<MatrixXd> factors(matrix);
    const VectorXd share = system.at.feed_to_zone.row(f).transpose() / system.at.feed[f];
    const VectorXd x = factors.solve(share.cwiseQuotient(system.at.volume));
    const double bypass = system.at.feed_to_outlet.row(f).sum() / system.at.feed[f];
    for (std::size_t j = 0; j < gradient.size(); ++j) {
      const WaterSystem::Part& slope = system.slope[j];
      const VectorXd share_slope =
          (slope.feed_to_zone.row(f).transpose() - share * slope.feed[f]) / system.at.feed[f];
      const VectorXd entry_slope =
          (share_slope - share.cwiseQuotient(system.at.volume).cwiseProduct(slope.volume))
              .cwiseQuotient(system.at.volume);
      const VectorXd dx = factors.solve(entry_slope + slope.transport * x);
      gradient[j] =
          outflow.dot(dx) + slope.zone_to_outlet.rowwise().sum().dot(x) +
          (slope.feed_to_outlet.row(f).sum() - bypass * slope.feed[f]) / system.at.feed[f];
    }
    return bypass + outflow.dot(x);
  }
  [[nodiscard]] double mean(std::span<const double> p) const override { return moment(p, 1); }
  [[nodiscard]] double variance(std::span<const double> p) const override {
    const double first = moment(p, 1);
    return moment(p, 2) - first * first;
  }

 private:
  [[nodiscard]] Injection injection() const {
    return {.kind = Injection::Kind::feed, .index = feed_};
  }
  [[nodiscard]] std::size_t n_outlets() const { return network_->water().outlets.size(); }
  [[nodiscard]] WaterSystem system_of(std::span<const double> p) const {
    auto system = network_->system(p);
    SZ_REQUIRE(system.has_value(), "no such network");
    return std::move(*system);
  }
  static double nothing(std::span<double> gradient) {
    for (double& entry : gradient) entry = 0.0;
    return 0.0;
  }
  /// Share of the dosed feed's tracer flow that leaves, all outlets together.
  double seen(std::span<const double> p, double theta, const NetworkDose& dose,
              std::span<double> gradient) const {
    const WaterSystem system = system_of(p);
    DoseHistory history(system, injection(), dose, !gradient.empty());
    history.advance(theta * days_);
    const double fed = system.at.feed[static_cast<Index>(feed_)];
    double sum = 0.0;
    for (double& entry : gradient) entry = 0.0;
    for (std::size_t o = 0; o < n_outlets(); ++o) {
      const double flow = system.at.outlet[static_cast<Index>(o)];
      sum += flow * history.outlet(o);
      for (std::size_t j = 0; j < gradient.size(); ++j) {
        gradient[j] += (flow * history.outlet_slope(o, j) +
                        system.slope[j].outlet[static_cast<Index>(o)] * history.outlet(o)) /
                       fed;
      }
    }
    for (std::size_t j = 0; j < gradient.size(); ++j) {
      gradient[j] -= sum * system.slope[j].feed[static_cast<Index>(feed_)] / (fed * fed);
    }
    return sum / fed;
  }
  /// k-th moment about the dose [turnovers^k]: k! outflow (-A)^-(k+1) e.
  [[nodiscard]] double moment(std::span<const double> p, int k) const {
    const WaterSystem system = system_of(p);
    const auto f = static_cast<Index>(feed_);
    const Eigen::PartialPivLU<MatrixXd> factors(-system.at.transport);
    VectorXd x = system.at.feed_to_zone.row(f).transpose() / system.at.feed[f];
    x = x.cwiseQuotient(system.at.volume).eval();
    double factorial = 1.0;
    for (int i = 0; i <= k; ++i) {
      x = factors.solve(x).eval();
      if (i > 0) factorial *= i;
    }
    return factorial * system.at.zone_to_outlet.rowwise().sum().dot(x) / std::pow(days_, k);
  }

  std::shared_ptr<const WaterNetwork> network_;
  std::size_t feed_;
  double days_;
  std::string name_;
  std::vector<RtdParameter> parameters_;
};

}  // namespace

std::unique_ptr<const RtdModel> network_residence(std::shared_ptr<const WaterNetwork> network,
                                                  std::size_t feed, double days_per_turnover,
                                                  std::string name,
                                                  std::vector<RtdParameter> parameters) {
  return std::make_unique<NetworkResidence>(std::move(network), feed, days_per_turnover,
                                            std::move(name), std::move(parameters));
}

}  // namespace stillzone::network
