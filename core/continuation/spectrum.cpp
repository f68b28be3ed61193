#include "core/continuation/spectrum.hpp"

#include <Eigen/Dense>
#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>

#include "core/dae/evaluation.hpp"
#include "core/require.hpp"

namespace stillzone::core {

namespace {

std::optional<std::complex<double>> dominant_of(const Eigen::MatrixXd& matrix) {
  if (!matrix.allFinite()) return std::nullopt;
  const Eigen::EigenSolver<Eigen::MatrixXd> solver(matrix, false);
  if (solver.info() != Eigen::Success || matrix.rows() == 0) return std::nullopt;
  const auto& values = solver.eigenvalues();
  std::complex<double> dominant = values[0];
  for (Eigen::Index i = 1; i < values.size(); ++i) {
    if (values[i].real() > dominant.real()) dominant = values[i];
  }
  return dominant;
}

}  // namespace

std::optional<Spectrum> spectrum_at(DaeSystem& system, std::span<const double> y,
                                    std::size_t most_unknowns) {
  const auto differential = system.differential();
  const auto floors = system.floors();
  std::vector<Eigen::Index> number(y.size());
  Eigen::Index n_d = 0;
  Eigen::Index n_a = 0;
  for (std::size_t i = 0; i < y.size(); ++i) number[i] = differential[i] != 0 ? n_d++ : n_a++;
  if (n_d == 0 || static_cast<std::size_t>(n_d) > most_unknowns) return std::nullopt;

  const SparsePattern& pattern = system.pattern();
  std::vector<double> values(static_cast<std::size_t>(pattern.n_entries()));
  evaluate_jacobian(system, y, values);
  if (!all_finite(values)) return std::nullopt;
  Eigen::MatrixXd dd = Eigen::MatrixXd::Zero(n_d, n_d);
  Eigen::MatrixXd da = Eigen::MatrixXd::Zero(n_d, n_a);
  Eigen::MatrixXd ad = Eigen::MatrixXd::Zero(n_a, n_d);
  Eigen::MatrixXd aa = Eigen::MatrixXd::Zero(n_a, n_a);
  const auto size = [&](std::size_t i) { return std::max(std::abs(y[i]), floors[i]); };
  for (std::size_t j = 0; j < y.size(); ++j) {
    for (auto k = pattern.start[j]; k < pattern.start[j + 1]; ++k) {
      const auto i = static_cast<std::size_t>(pattern.row[static_cast<std::size_t>(k)]);
      const double value = values[static_cast<std::size_t>(k)] * size(j) / size(i);
      if (differential[i] != 0) {
        (differential[j] != 0 ? dd : da)(number[i], number[j]) = value;
      } else {
        (differential[j] != 0 ? ad : aa)(number[i], number[j]) = value;
      }
    }
  }
  if (n_a > 0) dd -= da * aa.partialPivLu().solve(ad);
  const auto dominant = dominant_of(dd);
  if (!dominant) return std::nullopt;
  return Spectrum{*dominant};
}

std::optional<double> spectral_abscissa(std::span<const double> matrix, std::size_t n) {
  SZ_REQUIRE(matrix.size() == n * n && n > 0, "{} entries for order {}", matrix.size(), n);
  using RowMajor = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;
  const auto order = static_cast<Eigen::Index>(n);
  const auto dominant = dominant_of(Eigen::Map<const RowMajor>(matrix.data(), order, order));
  if (!dominant) return std::nullopt;
  return dominant->real();
}

}  // namespace stillzone::core
