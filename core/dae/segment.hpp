#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "core/dae/dae_system.hpp"
#include "core/dae/integrator.hpp"
#include "core/require.hpp"

namespace stillzone::core {

/// Walks through the record times of a request in order.
class RecordTimes {
 public:
  explicit RecordTimes(const IntegrationRequest& request) : request_(request) {
    double last = request.from;
    for (const double t : request.record_at) {
      SZ_REQUIRE(t >= last && t <= request.until, "record time {} after {}, within {} .. {}", t,
                 last, request.from, request.until);
      last = t;
    }
  }
  /// True while a record time <= t is left; `time` is then the next one.
  [[nodiscard]] bool due(double t) const {
    return request_.record && next_ < request_.record_at.size() && request_.record_at[next_] <= t;
  }
  [[nodiscard]] double time() const { return request_.record_at[next_]; }
  void record(std::span<const double> y, std::span<const double> q) {
    request_.record(request_.record_at[next_], y, q);
    ++next_;
  }

 private:
  const IntegrationRequest& request_;
  std::size_t next_ = 0;
};

/// First steps that met the tolerance after earlier switches, by kind of interval; 0: none yet.
class LearntSteps {
 public:
  [[nodiscard]] double of(std::size_t kind) const {
    return kind < steps_.size() ? steps_[kind] : 0.0;
  }
  void learn(std::size_t kind, double step) {
    if (kind >= steps_.size()) steps_.resize(kind + 1, 0.0);
    steps_[kind] = step;
  }

 private:
  std::vector<double> steps_;
};

}  // namespace stillzone::core
