#include "network/flow_system.hpp"

#include <Eigen/Dense>
#include <Eigen/Sparse>
#include <Eigen/SparseLU>
#include <Eigen/SparseQR>
#include <algorithm>
#include <cmath>
#include <optional>

#include "core/require.hpp"
#include "network/zone_graph.hpp"

namespace stillzone::network {

namespace {

using SparseMatrix = Eigen::SparseMatrix<double>;
using SparseOrthogonal = Eigen::SparseQR<SparseMatrix, Eigen::COLAMDOrdering<int>>;
using SparseTriangular = Eigen::SparseLU<SparseMatrix, Eigen::COLAMDOrdering<int>>;

/// Cores up to this many unknowns are dense: a factorisation of some 10 ms at most.
constexpr std::size_t kDenseLimit = 200;

/// Null vectors from a rank-revealing factorisation A P = Q [R1 R2; 0 0]: P [-R1^-1 R2; I].
template <class Permutation>
std::vector<Eigen::VectorXd> null_vectors(const Eigen::MatrixXd& r1, const Eigen::MatrixXd& r2,
                                          const Permutation& permutation) {
  std::vector<Eigen::VectorXd> vectors;
  const Eigen::Index rank = r1.rows();
  for (Eigen::Index k = 0; k < r2.cols(); ++k) {
    Eigen::VectorXd moved = Eigen::VectorXd::Zero(permutation.size());
    if (rank > 0) {
      moved.head(rank) = -r1.triangularView<Eigen::Upper>().solve(r2.col(k));
    }
    moved(rank + k) = 1.0;
    vectors.emplace_back(permutation * moved);
  }
  return vectors;
}

/// One term per variable, those that cancel taken out.
void merge_terms(FlowSystem::Row& row) {
  std::ranges::sort(row, {}, &FlowSystem::Term::variable);
  FlowSystem::Row merged;
  double largest = 0.0;  // of the terms that made up merged.back()
  const auto drop_cancelled = [&] {
    if (!merged.empty() && std::abs(merged.back().factor) <= 1e-14 * largest) merged.pop_back();
  };
  for (const FlowSystem::Term& term : row) {
    if (!merged.empty() && merged.back().variable == term.variable) {
      merged.back().factor += term.factor;
      largest = std::max(largest, std::abs(term.factor));
      continue;
    }
    drop_cancelled();
    merged.push_back(term);
    largest = std::abs(term.factor);
  }
  drop_cancelled();
  row = std::move(merged);
}

/// One independent part of the equations, factored.
class CoreSolver {
 public:
  explicit CoreSolver(const SparseMatrix& matrix) {
    const auto n = static_cast<std::size_t>(matrix.cols());
    if (n <= kDenseLimit) {
      dense_.emplace(Eigen::MatrixXd(matrix));
      rank_ = dense_->rank();
    } else if (!factor_triangular(matrix)) {
      orthogonal_ = std::make_unique<SparseOrthogonal>(matrix);
      rank_ = orthogonal_->rank();
    }
  }

  [[nodiscard]] Eigen::Index rank() const { return rank_; }

  [[nodiscard]] Eigen::VectorXd solve(const Eigen::VectorXd& right) const {
    if (dense_) return dense_->solve(right);
    if (triangular_) return triangular_->solve(right);
    return orthogonal_->solve(right);
  }

  [[nodiscard]] std::vector<Eigen::VectorXd> null_space(Eigen::Index most) const {
    if (triangular_) return {};
    if (dense_) {
      const Eigen::Index k = std::min(most, dense_->cols() - rank_);
      const Eigen::MatrixXd r = dense_->matrixR();
      return null_vectors(r.topLeftCorner(rank_, rank_), r.block(0, rank_, rank_, k),
                          Eigen::PermutationMatrix<Eigen::Dynamic>(dense_->colsPermutation()));
    }
    return sparse_null_space(most);
  }

 private:
  /// The same as null_vectors, without making R dense.
  [[nodiscard]] std::vector<Eigen::VectorXd> sparse_null_space(Eigen::Index most) const {
    const Eigen::Index n = orthogonal_->cols();
    const SparseMatrix r = orthogonal_->matrixR();
    const SparseMatrix r1 = r.topLeftCorner(rank_, rank_);
    std::vector<Eigen::VectorXd> vectors;
    for (Eigen::Index k = 0; k < std::min(most, n - rank_); ++k) {
      Eigen::VectorXd moved = Eigen::VectorXd::Zero(n);
      const Eigen::VectorXd column = r.col(rank_ + k);
      moved.head(rank_) = -r1.triangularView<Eigen::Upper>().solve(column.head(rank_).eval());
      moved(rank_ + k) = 1.0;
      vectors.emplace_back(orthogonal_->colsPermutation() * moved);
    }
    return vectors;
  }

  /// LU of a square core, kept when it gives back a known vector: then the core is regular. The
  /// limit tells regular from singular only; what a solution misses is checked row by row.
  bool factor_triangular(const SparseMatrix& matrix) {
    if (matrix.rows() != matrix.cols()) return false;
    auto candidate = std::make_unique<SparseTriangular>();
    candidate->compute(matrix);
    if (candidate->info() != Eigen::Success) return false;
    Eigen::VectorXd known(matrix.cols());
    for (Eigen::Index i = 0; i < known.size(); ++i) {
      known(i) = 1.0 + 0.5 * std::sin(static_cast<double>(i));
    }
    const Eigen::VectorXd back = candidate->solve(matrix * known);
    const double off = (back - known).cwiseAbs().maxCoeff();
    if (!(off < 1e-3)) return false;
    triangular_ = std::move(candidate);
    rank_ = matrix.cols();
    return true;
  }

  std::optional<Eigen::ColPivHouseholderQR<Eigen::MatrixXd>> dense_;
  std::unique_ptr<SparseTriangular> triangular_;
  std::unique_ptr<SparseOrthogonal> orthogonal_;
  Eigen::Index rank_ = 0;
};

}  // namespace

struct FlowSystem::Core {
  std::vector<std::size_t> rows;
  std::vector<std::size_t> variables;
  std::unique_ptr<CoreSolver> solver;
};

/// What is still to be solved while rows and columns are peeled off.
struct FlowSystem::Peeling {
  std::vector<std::vector<std::size_t>> rows_of;  ///< per variable
  std::vector<std::size_t> n_unknown;             ///< per row
  std::vector<bool> row_done;
  std::vector<bool> solved;  ///< per variable: known, or solved by a peeled row

  Peeling(std::span<const Row> rows, const std::vector<bool>& known)
      : rows_of(known.size()), n_unknown(rows.size(), 0), row_done(rows.size()), solved(known) {
    for (std::size_t r = 0; r < rows.size(); ++r) {
      for (const Term& term : rows[r]) {
        SZ_REQUIRE(term.variable < known.size(), "variable {}", term.variable);
        if (known[term.variable]) continue;
        rows_of[term.variable].push_back(r);
        ++n_unknown[r];
      }
    }
  }

  /// Rows with one unknown left, again and again.
  std::vector<Step> peel_rows(std::span<const Row> rows) {
    std::vector<Step> steps;
    std::vector<std::size_t> ready;
    for (std::size_t r = rows.size(); r-- > 0;) {
      if (n_unknown[r] == 1) ready.push_back(r);
      if (n_unknown[r] == 0) row_done[r] = true;
    }
    while (!ready.empty()) {
      const std::size_t r = ready.back();
      ready.pop_back();
      if (row_done[r]) continue;
      row_done[r] = true;
      if (n_unknown[r] != 1) continue;
      const auto term = std::ranges::find_if(
          rows[r], [this](const Term& candidate) { return !solved[candidate.variable]; });
      solved[term->variable] = true;
      steps.push_back({r, term->variable, term->factor});
      for (const std::size_t other : rows_of[term->variable]) {
        if (--n_unknown[other] == 1) ready.push_back(other);
        if (n_unknown[other] == 0) row_done[other] = true;
      }
    }
    return steps;
  }

  /// Unknowns that stand in one remaining row: that row gives them once the rest is known.
  std::vector<Step> peel_columns(std::span<const Row> rows) {
    std::vector<Step> steps;
    std::vector<std::size_t> n_rows(rows_of.size(), 0);
    std::vector<std::size_t> ready;
    for (std::size_t v = 0; v < rows_of.size(); ++v) {
      if (solved[v]) continue;
      for (const std::size_t r : rows_of[v]) n_rows[v] += row_done[r] ? 0U : 1U;
      if (n_rows[v] == 1) ready.push_back(v);
    }
    while (!ready.empty()) {
      const std::size_t v = ready.back();
      ready.pop_back();
      if (n_rows[v] != 1) continue;
      const auto row = std::ranges::find_if(rows_of[v], [this](auto r) { return !row_done[r]; });
      const std::size_t r = *row;
      row_done[r] = true;
      solved[v] = true;
      for (const Term& term : rows[r]) {
        if (term.variable == v) steps.push_back({r, v, term.factor});
        if (solved[term.variable]) continue;
        if (--n_rows[term.variable] == 1) ready.push_back(term.variable);
      }
    }
    std::ranges::reverse(steps);
    return steps;
  }
};

FlowSystem::FlowSystem(std::vector<Row> rows, std::vector<bool> known)
    : rows_(std::move(rows)), known_(std::move(known)) {
  for (Row& row : rows_) {
    merge_terms(row);
    n_terms_ += row.size();
  }
  Peeling peeling(rows_, known_);
  first_ = peeling.peel_rows(rows_);
  last_ = peeling.peel_columns(rows_);
  build_cores(peeling);
}

FlowSystem::~FlowSystem() = default;

void FlowSystem::build_cores(const Peeling& peeling) {
  constexpr std::size_t kNone = static_cast<std::size_t>(-1);
  std::vector<std::size_t> rows;
  std::vector<std::size_t> variables;
  std::vector<std::size_t> column_of(known_.size(), kNone);
  for (std::size_t r = 0; r < rows_.size(); ++r) {
    if (!peeling.row_done[r]) rows.push_back(r);
  }
  for (std::size_t v = 0; v < known_.size(); ++v) {
    if (peeling.solved[v]) continue;
    const bool anywhere =
        std::ranges::any_of(peeling.rows_of[v], [&](auto r) { return !peeling.row_done[r]; });
    if (anywhere) {
      column_of[v] = variables.size();
      variables.push_back(v);
    } else {
      open_.push_back(v);
    }
  }
  // Rows and unknowns that touch each other form one core.
  std::vector<Link> links;
  for (std::size_t i = 0; i < rows.size(); ++i) {
    for (const Term& term : rows_[rows[i]]) {
      if (column_of[term.variable] == kNone) continue;
      links.push_back({i, rows.size() + column_of[term.variable]});
    }
  }
  const auto parts = ZoneGraph(rows.size() + variables.size(), links).parts();
  const std::size_t n_parts = parts.empty() ? 0 : *std::ranges::max_element(parts) + 1;
  cores_.resize(n_parts);
  for (std::size_t i = 0; i < rows.size(); ++i) cores_[parts[i]].rows.push_back(rows[i]);
  for (std::size_t j = 0; j < variables.size(); ++j) {
    Core& core = cores_[parts[rows.size() + j]];
    column_of[variables[j]] = core.variables.size();
    core.variables.push_back(variables[j]);
  }
  for (Core& core : cores_) {
    std::vector<Eigen::Triplet<double, int>> entries;
    for (std::size_t i = 0; i < core.rows.size(); ++i) {
      for (const Term& term : rows_[core.rows[i]]) {
        if (peeling.solved[term.variable] || column_of[term.variable] == kNone) continue;
        entries.emplace_back(static_cast<int>(i), static_cast<int>(column_of[term.variable]),
                             term.factor);
      }
    }
    SparseMatrix matrix(static_cast<Eigen::Index>(core.rows.size()),
                        static_cast<Eigen::Index>(core.variables.size()));
    matrix.setFromTriplets(entries.begin(), entries.end());
    matrix.makeCompressed();
    core.solver = std::make_unique<CoreSolver>(matrix);
  }
}

void FlowSystem::run(std::span<const Step> steps, std::span<double> x) const {
  for (const Step& step : steps) {
    double sum = 0.0;
    for (const Term& term : rows_[step.row]) {
      if (term.variable != step.variable) sum += term.factor * x[term.variable];
    }
    x[step.variable] = -sum / step.factor;
  }
}

void FlowSystem::substitute(std::span<double> x) const {
  SZ_REQUIRE(x.size() == known_.size(), "{} values for {} variables", x.size(), known_.size());
  for (std::size_t v = 0; v < known_.size(); ++v) {
    if (!known_[v]) x[v] = 0.0;
  }
  run(first_, x);
  for (const Core& core : cores_) {
    Eigen::VectorXd right(static_cast<Eigen::Index>(core.rows.size()));
    for (std::size_t i = 0; i < core.rows.size(); ++i) {
      double sum = 0.0;  // the core's own unknowns are still 0
      for (const Term& term : rows_[core.rows[i]]) sum += term.factor * x[term.variable];
      right(static_cast<Eigen::Index>(i)) = -sum;
    }
    const Eigen::VectorXd solution = core.solver->solve(right);
    for (std::size_t j = 0; j < core.variables.size(); ++j) {
      x[core.variables[j]] = solution(static_cast<Eigen::Index>(j));
    }
  }
  run(last_, x);
}

std::size_t FlowSystem::n_free() const {
  std::size_t n = open_.size();
  for (const Core& core : cores_) {
    n += core.variables.size() - static_cast<std::size_t>(core.solver->rank());
  }
  return n;
}

std::vector<std::vector<FlowSystem::Term>> FlowSystem::free_directions(std::size_t most) const {
  std::vector<std::vector<Term>> directions;
  const auto add = [&](std::vector<double> x) {
    run(last_, x);
    std::vector<Term> direction;
    for (std::size_t v = 0; v < x.size(); ++v) {
      if (std::abs(x[v]) > 1e-9) direction.push_back({v, x[v]});
    }
    directions.push_back(std::move(direction));
  };
  for (const Core& core : cores_) {
    if (directions.size() >= most) return directions;
    const auto left = static_cast<Eigen::Index>(most - directions.size());
    for (const Eigen::VectorXd& vector : core.solver->null_space(left)) {
      std::vector<double> x(known_.size(), 0.0);
      for (std::size_t j = 0; j < core.variables.size(); ++j) {
        x[core.variables[j]] = vector(static_cast<Eigen::Index>(j));
      }
      add(std::move(x));
    }
  }
  for (const std::size_t v : open_) {
    if (directions.size() >= most) break;
    std::vector<double> x(known_.size(), 0.0);
    x[v] = 1.0;
    add(std::move(x));
  }
  return directions;
}

double FlowSystem::relative_residual(std::size_t row, std::span<const double> x,
                                     double rounding) const {
  double sum = 0.0;
  double largest = 0.0;
  for (const Term& term : rows_[row]) {
    const double value = term.factor * x[term.variable];
    sum += value;
    largest = std::max(largest, std::abs(value));
  }
  return largest > 0.0 && std::abs(sum) > rounding ? std::abs(sum) / largest : 0.0;
}

}  // namespace stillzone::network
