#pragma once

#include <Eigen/Dense>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "core/dae/dae_system.hpp"

namespace stillzone::test {

/// A DAE given by functions, for tests. The Jacobian is written into a dense matrix; the pattern is
/// full, or the one given.
class FunctionSystem : public core::DaeSystem {
 public:
  using Vector = std::span<const double>;
  using Rates = std::function<void(Vector y, std::span<double> f)>;
  using Jacobian = std::function<void(Vector y, Eigen::MatrixXd& j)>;

  FunctionSystem(std::size_t n, Rates rates, Jacobian jacobian);

  std::vector<std::uint8_t> differential_flags;
  std::vector<double> floor_values;
  std::size_t quadratures = 0;
  std::function<void(Vector y, std::span<double> g)> quadrature;
  std::function<void(Vector y, Vector v, std::span<double> gv)> quadrature_along;
  std::vector<double> switch_times;  ///< rising
  std::function<void(double t)> on_enter;
  std::function<std::size_t()> kind;
  std::function<core::Result<core::Done>(std::span<double> y)> consistent;
  long rate_calls = 0;
  long jacobian_calls = 0;

  std::size_t n_unknowns() const override { return n_; }
  std::size_t n_quadratures() const override { return quadratures; }
  std::span<const std::uint8_t> differential() const override { return differential_flags; }
  std::span<const double> floors() const override { return floor_values; }
  const core::SparsePattern& pattern() const override { return pattern_; }
  void rates(Vector y, std::span<double> f) override;
  void jacobian(Vector y, std::span<double> values) override;
  void quadrature_rates(Vector y, std::span<double> g) override;
  void quadrature_rates_along(Vector y, Vector v, std::span<double> gv) override;
  std::optional<double> next_switch(double t) const override;
  void enter(double t) override;
  std::size_t interval_kind() const override { return kind ? kind() : 0; }
  core::Result<core::Done> make_consistent(std::span<double> y) override;
  std::string unknown_place(std::size_t i) const override;
  std::string unknown_quantity(std::size_t i) const override;

 private:
  std::size_t n_;
  Rates rates_;
  Jacobian jacobian_;
  core::SparsePattern pattern_;
  Eigen::MatrixXd dense_;
};

/// y' = A y + b with quadratures q' = C y.
[[nodiscard]] std::unique_ptr<FunctionSystem> linear_system(const Eigen::MatrixXd& a,
                                                            const Eigen::VectorXd& b,
                                                            const Eigen::MatrixXd& c);

}  // namespace stillzone::test
