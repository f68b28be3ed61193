#include "network/tracer/step_response.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>

namespace stillzone::network {
namespace {

/// Level and approach for a given rate: linear weighted least squares of level - a exp(-rate x).
struct Approach {
  double level = 0.0;
  double drop = 0.0;
  double square_sum = HUGE_VAL;
};

Approach approach_at(const NetCurve& curve, std::size_t first, double rate) {
  // Normal equations of columns 1 and -exp(-rate x), right side C, square sum of C.
  double n11 = 0.0;
  double n12 = 0.0;
  double n22 = 0.0;
  double r1 = 0.0;
  double r2 = 0.0;
  for (std::size_t i = first; i < curve.size(); ++i) {
    const double weight = 1.0 / (curve.error[i] * curve.error[i]);
    const double column = -std::exp(-rate * (curve.age[i] - curve.age[first]));
    n11 += weight;
    n12 += weight * column;
    n22 += weight * column * column;
    r1 += weight * curve.height[i];
    r2 += weight * column * curve.height[i];
  }
  const double determinant = n11 * n22 - n12 * n12;
  if (!(determinant > 1e-14 * n11 * n22)) return {};
  Approach approach{(n22 * r1 - n12 * r2) / determinant, (n11 * r2 - n12 * r1) / determinant, 0.0};
  for (std::size_t i = first; i < curve.size(); ++i) {
    const double model =
        approach.level - approach.drop * std::exp(-rate * (curve.age[i] - curve.age[first]));
    const double residual = (curve.height[i] - model) / curve.error[i];
    approach.square_sum += residual * residual;
  }
  return approach;
}

/// Standard error of the level with rate and drop free.
double level_error(const NetCurve& curve, std::size_t first, double rate, const Approach& best) {
  Eigen::Matrix3d normal = Eigen::Matrix3d::Zero();
  for (std::size_t i = first; i < curve.size(); ++i) {
    const double x = curve.age[i] - curve.age[first];
    const double decay = std::exp(-rate * x);
    const Eigen::Vector3d row =
        Eigen::Vector3d(1.0, -decay, best.drop * x * decay) / curve.error[i];
    normal += row * row.transpose();
  }
  const Eigen::FullPivLU<Eigen::Matrix3d> lu(normal);
  if (!lu.isInvertible()) return HUGE_VAL;
  const double freedom = std::max(static_cast<double>(curve.size() - first) - 3.0, 1.0);
  return std::sqrt(lu.inverse()(0, 0) * std::max(best.square_sum / freedom, 1.0));
}

/// The rate with the least square sum, by a scan and a golden section between its neighbours.
double best_rate(const NetCurve& curve, std::size_t first) {
  constexpr int kScan = 40;
  const double span = curve.age.back() - curve.age[first];
  const auto rate_of = [span](double s) {
    return std::exp(std::log(0.2 / span) + s * std::log(500.0));
  };
  const auto cost = [&](double s) { return approach_at(curve, first, rate_of(s)).square_sum; };
  double best = 0.0;
  double least = cost(best);
  for (int k = 1; k <= kScan; ++k) {
    const double s = static_cast<double>(k) / kScan;
    const double here = cost(s);
    if (here < least) {
      best = s;
      least = here;
    }
  }
  double low = std::max(best - 1.0 / kScan, 0.0);
  double high = std::min(best + 1.0 / kScan, 1.0);
  const double golden = 0.5 * (std::sqrt(5.0) - 1.0);
  double a = high - golden * (high - low);
  double b = low + golden * (high - low);
  double cost_a = cost(a);
  double cost_b = cost(b);
  for (int k = 0; k < 30; ++k) {  // to 1e-7 of ln(rate): the level needs no more
    if (cost_a < cost_b) {
      high = b;
      b = a;
      cost_b = cost_a;
      a = high - golden * (high - low);
      cost_a = cost(a);
    } else {
      low = a;
      a = b;
      cost_a = cost_b;
      b = low + golden * (high - low);
      cost_b = cost(b);
    }
  }
  return rate_of(0.5 * (low + high));
}

/// The nearest rising sequence under weights (pool adjacent violators).
std::vector<double> made_rising(const std::vector<double>& values,
                                const std::vector<double>& weights) {
  struct Block {
    double sum = 0.0;
    double weight = 0.0;
    std::size_t n = 0;
    [[nodiscard]] double mean() const { return sum / weight; }
  };
  std::vector<Block> blocks;
  for (std::size_t i = 0; i < values.size(); ++i) {
    blocks.push_back({weights[i] * values[i], weights[i], 1});
    while (blocks.size() > 1 && blocks[blocks.size() - 2].mean() >= blocks.back().mean()) {
      Block& before = blocks[blocks.size() - 2];
      before.sum += blocks.back().sum;
      before.weight += blocks.back().weight;
      before.n += blocks.back().n;
      blocks.pop_back();
    }
  }
  std::vector<double> rising;
  for (const Block& block : blocks) rising.insert(rising.end(), block.n, block.mean());
  return rising;
}

}  // namespace

StepPlateau step_plateau(const NetCurve& curve) {
  constexpr std::size_t kFewest = 5;
  constexpr double kWellKnown = 0.05;
  const std::size_t n_last = std::min<std::size_t>(3, curve.size());
  double mean = 0.0;
  double square = 0.0;
  for (std::size_t i = curve.size() - n_last; i < curve.size(); ++i) {
    mean += curve.height[i] / static_cast<double>(n_last);
    square += curve.error[i] * curve.error[i];
  }
  StepPlateau plateau{mean, std::sqrt(square) / static_cast<double>(n_last), true, n_last};
  std::size_t first = curve.size();
  while (first > 0 && curve.height[first - 1] >= 0.5 * mean) --first;
  if (curve.size() - first < kFewest) first = curve.size() - std::min(curve.size(), kFewest);
  if (curve.size() - first >= kFewest) {
    const double rate = best_rate(curve, first);
    const Approach best = approach_at(curve, first, rate);
    const double error = level_error(curve, first, rate, best);
    if (best.level > 0.0 && best.drop >= 0.0 && error <= kWellKnown * best.level) {
      return {best.level, error, true, curve.size() - first};
    }
  }
  const double rise = curve.height.back() - curve.height[curve.size() - n_last];
  plateau.reached =
      rise <= 2.0 * std::hypot(curve.error.back(), curve.error[curve.size() - n_last]);
  return plateau;
}

DensityNodes step_density(const NetCurve& curve, double level,
                          const std::optional<ExponentialTail>& tail) {
  constexpr double kEdge = 1e-9;  // of a step: two nodes make a jump
  std::vector<double> share;
  std::vector<double> weight;
  for (std::size_t i = 0; i < curve.size(); ++i) {
    share.push_back(curve.height[i] / level);
    weight.push_back(1.0 / (curve.error[i] * curve.error[i]));
  }
  share = made_rising(share, weight);
  // The last of rising noise stands too high: there the fitted approach says what has come through.
  const double top =
      tail ? std::clamp(1.0 - tail->height_at(curve.age.back()) / level, 0.0, 1.0) : 1.0;
  for (double& f : share) f = std::clamp(f, 0.0, top);
  DensityNodes nodes;
  double age = 0.0;
  double f = 0.0;
  for (std::size_t i = 0; i < curve.size(); ++i) {
    const double width = curve.age[i] - age;
    if (width <= 0.0) continue;  // the sample at the dose itself
    const double density = (share[i] - f) / width;
    nodes.age.push_back(nodes.age.empty() ? age : age + kEdge * width);
    nodes.height.push_back(density);
    nodes.age.push_back(curve.age[i]);
    nodes.height.push_back(density);
    age = curve.age[i];
    f = share[i];
  }
  if (tail) {
    constexpr int kNodes = 320;
    constexpr double kLengths = 16.0;
    for (int k = 0; k <= kNodes; ++k) {
      const double x = kLengths * (k + kEdge) / kNodes;
      nodes.age.push_back(age + x / tail->rate);
      nodes.height.push_back((1.0 - f) * tail->rate * std::exp(-x));
    }
  }
  return nodes;
}

}  // namespace stillzone::network
