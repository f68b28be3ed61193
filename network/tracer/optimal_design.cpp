#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <utility>

#include "network/tracer/test_plan.hpp"

namespace stillzone::network {
namespace {

using Eigen::Index;

/// ln det of the information of some candidates, summed over models and divided by their
/// parameters; a small ridge stands in while there are too few points.
class Criterion {
 public:
  Criterion(const std::vector<std::vector<double>>& weighted,
            const std::vector<std::size_t>& n_parameters, std::size_t n_candidates)
      : weighted_(weighted), n_parameters_(n_parameters) {
    for (std::size_t m = 0; m < weighted.size(); ++m) {
      const auto p = static_cast<Index>(n_parameters[m]);
      ridge_.emplace_back(Eigen::MatrixXd::Zero(p, p));
      for (std::size_t c = 0; c < n_candidates; ++c) {
        const Eigen::VectorXd g = gradient(m, c);
        ridge_[m].diagonal() += 1e-10 * g.cwiseAbs2();
      }
    }
  }
  [[nodiscard]] double of(const std::vector<std::size_t>& points) const {
    double sum = 0.0;
    for (std::size_t m = 0; m < weighted_.size(); ++m) {
      Eigen::MatrixXd information = ridge_[m];
      for (const std::size_t c : points) {
        const Eigen::VectorXd g = gradient(m, c);
        information.noalias() += g * g.transpose();
      }
      const Eigen::LLT<Eigen::MatrixXd> factor(information);
      if (factor.info() != Eigen::Success) return -HUGE_VAL;
      sum += 2.0 * factor.matrixLLT().diagonal().array().log().sum() /
             static_cast<double>(n_parameters_[m]);
    }
    return sum;
  }

 private:
  [[nodiscard]] Eigen::VectorXd gradient(std::size_t m, std::size_t c) const {
    const std::size_t p = n_parameters_[m];
    return Eigen::Map<const Eigen::VectorXd>(weighted_[m].data() + c * p, static_cast<Index>(p));
  }
  const std::vector<std::vector<double>>& weighted_;
  const std::vector<std::size_t>& n_parameters_;
  std::vector<Eigen::MatrixXd> ridge_;
};

}  // namespace

std::vector<std::size_t> optimal_design(const std::vector<std::vector<double>>& weighted,
                                        const std::vector<std::size_t>& n_parameters,
                                        const std::vector<double>& candidates,
                                        std::vector<std::size_t> kept, std::size_t n_samples,
                                        double shortest_gap) {
  const Criterion criterion(weighted, n_parameters, candidates.size());
  const std::size_t n_kept = kept.size();
  std::vector<std::size_t> points = std::move(kept);
  const auto fits = [&](std::size_t c, std::size_t leaving) {
    for (std::size_t i = 0; i < points.size(); ++i) {
      if (i == leaving) continue;
      if (std::abs(candidates[points[i]] - candidates[c]) < shortest_gap * (1.0 - 1e-9)) {
        return false;
      }
    }
    return true;
  };
  constexpr std::size_t kNone = static_cast<std::size_t>(-1);
  while (points.size() < n_samples) {  // build up
    double best = -HUGE_VAL;
    std::size_t best_candidate = kNone;
    for (std::size_t c = 0; c < candidates.size(); ++c) {
      if (!fits(c, kNone)) continue;
      points.push_back(c);
      const double value = criterion.of(points);
      points.pop_back();
      if (value > best) {
        best = value;
        best_candidate = c;
      }
    }
    if (best_candidate == kNone) break;
    points.push_back(best_candidate);
  }
  double now = criterion.of(points);
  for (int round = 0; round < 10; ++round) {  // exchange
    bool improved = false;
    for (std::size_t i = n_kept; i < points.size(); ++i) {
      std::size_t best_candidate = points[i];
      for (std::size_t c = 0; c < candidates.size(); ++c) {
        if (!fits(c, i)) continue;
        points[i] = c;
        const double value = criterion.of(points);
        if (value > now + 1e-9) {
          now = value;
          best_candidate = c;
          improved = true;
        }
      }
      points[i] = best_candidate;
    }
    if (!improved) break;
  }
  std::ranges::sort(points, {}, [&](std::size_t c) { return candidates[c]; });
  return points;
}

}  // namespace stillzone::network
