#include <klu.h>

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <vector>

#include "core/dae/linear_solver.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

// KLU's 64-bit interface counts in its own integer type: long before SuiteSparse 6, int64_t from
// then on.
using KluInt = std::remove_pointer_t<decltype(klu_l_symbolic::P)>;
static_assert(sizeof(KluInt) == sizeof(std::int64_t));

/// Below this reciprocal pivot growth the pivots chosen for an earlier matrix lose too many digits
/// on this one: LU keeps about 16 - log10(1 / growth) of them.
constexpr double kLeastPivotGrowth = 1e-5;

class KluSolver final : public LinearSolver {
 public:
  explicit KluSolver(const SparsePattern& pattern)
      : n_(pattern.n),
        start_(pattern.start.begin(), pattern.start.end()),
        row_(pattern.row.begin(), pattern.row.end()),
        diagonal_(pattern.diagonal.begin(), pattern.diagonal.end()),
        values_(pattern.row.size()) {
    SZ_REQUIRE(n_ > 0 && static_cast<std::int64_t>(row_.size()) == pattern.n_entries(),
               "n {} rows {}", n_, row_.size());
    klu_l_defaults(&common_);
    common_.ordering = 0;  // AMD
    symbolic_ = klu_l_analyze(n_, start_.data(), row_.data(), &common_);
    SZ_REQUIRE(symbolic_ != nullptr, "KLU analysis failed with status {}", common_.status);
  }

  ~KluSolver() override {
    if (numeric_ != nullptr) klu_l_free_numeric(&numeric_, &common_);
    klu_l_free_symbolic(&symbolic_, &common_);
  }

  bool factor(std::span<const double> diagonal, std::span<const double> jacobian) override {
    SZ_REQUIRE(diagonal.size() == diagonal_.size() && jacobian.size() == values_.size(),
               "diagonal {} of {}, entries {} of {}", diagonal.size(), diagonal_.size(),
               jacobian.size(), values_.size());
    ++n_factorisations;
    usable_ = false;
    double poison = 0.0;
    for (std::size_t k = 0; k < jacobian.size(); ++k) {
      values_[k] = -jacobian[k];
      poison += 0.0 * jacobian[k];
    }
    for (std::size_t i = 0; i < diagonal.size(); ++i) {
      values_[static_cast<std::size_t>(diagonal_[i])] += diagonal[i];
      poison += 0.0 * diagonal[i];
    }
    if (!std::isfinite(poison)) {
      singular_column_ = column_not_finite();
      return false;
    }
    usable_ = refactor() || factor_anew();
    return usable_;
  }

  void solve(std::span<double> b) override {
    SZ_REQUIRE(usable_ && static_cast<std::int64_t>(b.size()) == n_, "usable {}, b {} of {}",
               usable_, b.size(), n_);
    ++n_solves;
    klu_l_solve(symbolic_, numeric_, n_, 1, b.data(), &common_);
  }

  std::int64_t singular_column() const override { return singular_column_; }
  std::string name() const override { return "KLU, AMD ordering"; }

 private:
  /// The pivots of the last full factorisation on the new values; false when they do not suit.
  bool refactor() {
    if (numeric_ == nullptr) return false;
    const auto ok =
        klu_l_refactor(start_.data(), row_.data(), values_.data(), symbolic_, numeric_, &common_);
    if (ok == 0 || common_.status != KLU_OK) return false;
    if (klu_l_rcond(symbolic_, numeric_, &common_) == 0 || !(common_.rcond > 0.0)) return false;
    return klu_l_rgrowth(start_.data(), row_.data(), values_.data(), symbolic_, numeric_,
                         &common_) != 0 &&
           common_.rgrowth > kLeastPivotGrowth;
  }

  bool factor_anew() {
    if (numeric_ != nullptr) klu_l_free_numeric(&numeric_, &common_);
    numeric_ = klu_l_factor(start_.data(), row_.data(), values_.data(), symbolic_, &common_);
    if (numeric_ != nullptr && common_.status == KLU_OK &&
        klu_l_rcond(symbolic_, numeric_, &common_) != 0 && common_.rcond > 0.0) {
      return true;
    }
    SZ_REQUIRE(common_.status == KLU_OK || common_.status == KLU_SINGULAR,
               "KLU factorisation failed with status {}", common_.status);
    singular_column_ = std::clamp<std::int64_t>(common_.singular_col, 0, n_ - 1);
    if (numeric_ != nullptr) klu_l_free_numeric(&numeric_, &common_);
    return false;
  }

  std::int64_t column_not_finite() const {
    for (std::int64_t j = 0; j < n_; ++j) {
      for (auto k = start_[static_cast<std::size_t>(j)];
           k < start_[static_cast<std::size_t>(j) + 1]; ++k) {
        if (!std::isfinite(values_[static_cast<std::size_t>(k)])) return j;
      }
    }
    return 0;
  }

  std::int64_t n_;
  std::vector<KluInt> start_;
  std::vector<KluInt> row_;
  std::vector<std::int64_t> diagonal_;
  std::vector<double> values_;
  klu_l_common common_{};
  klu_l_symbolic* symbolic_ = nullptr;  // owned, freed in the destructor
  klu_l_numeric* numeric_ = nullptr;    // owned, freed in the destructor
  bool usable_ = false;
  std::int64_t singular_column_ = 0;
};

}  // namespace

std::unique_ptr<LinearSolver> make_klu_solver(const SparsePattern& pattern) {
  return std::make_unique<KluSolver>(pattern);
}

}  // namespace stillzone::core
