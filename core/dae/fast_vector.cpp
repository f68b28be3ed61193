#include "core/dae/fast_vector.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "core/require.hpp"

// The operands of a vector operation are the same array or do not overlap: element by element is
// safe in either case.
#if defined(__clang__)
#define SZ_ELEMENTWISE _Pragma("clang loop vectorize(assume_safety)")
#else
#define SZ_ELEMENTWISE _Pragma("GCC ivdep")
#endif

namespace stillzone::core {
namespace {

double* data(N_Vector v) { return NV_DATA_S(v); }
std::size_t length(N_Vector v) { return static_cast<std::size_t>(NV_LENGTH_S(v)); }

/// Sum over i of term(i), in four interleaved partial sums.
template <class Term>
double sum_of(std::size_t n, Term term) {
  std::array<double, 4> part{};
  std::size_t i = 0;
  for (; i + 4 <= n; i += 4) {
    for (std::size_t k = 0; k < 4; ++k) part[k] += term(i + k);
  }
  for (; i < n; ++i) part[0] += term(i);
  return (part[0] + part[1]) + (part[2] + part[3]);
}

void linear_sum(double a, N_Vector x, double b, N_Vector y, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  const double* yd = data(y);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = a * xd[i] + b * yd[i];
}

void constant(double c, N_Vector z) { std::fill_n(data(z), length(z), c); }

void product(N_Vector x, N_Vector y, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  const double* yd = data(y);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = xd[i] * yd[i];
}

void quotient(N_Vector x, N_Vector y, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  const double* yd = data(y);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = xd[i] / yd[i];
}

void scale(double c, N_Vector x, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = c * xd[i];
}

void absolute(N_Vector x, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = std::abs(xd[i]);
}

void inverse(N_Vector x, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = 1.0 / xd[i];
}

void add_constant(N_Vector x, double b, N_Vector z) {
  const std::size_t n = length(z);
  const double* xd = data(x);
  double* zd = data(z);
  SZ_ELEMENTWISE
  for (std::size_t i = 0; i < n; ++i) zd[i] = xd[i] + b;
}

double dot_product(N_Vector x, N_Vector y) {
  const double* xd = data(x);
  const double* yd = data(y);
  return sum_of(length(x), [xd, yd](std::size_t i) { return xd[i] * yd[i]; });
}

double max_norm(N_Vector x) {
  double largest = 0.0;
  for (const double value : values_of(x)) largest = std::max(largest, std::abs(value));
  return largest;
}

double least(N_Vector x) {
  double result = std::numeric_limits<double>::max();
  for (const double value : values_of(x)) result = std::min(result, value);
  return result;
}

double wrms_norm(N_Vector x, N_Vector w) {
  const double* xd = data(x);
  const double* wd = data(w);
  const std::size_t n = length(x);
  const double sum = sum_of(n, [xd, wd](std::size_t i) {
    const double weighted = xd[i] * wd[i];
    return weighted * weighted;
  });
  return std::sqrt(sum / static_cast<double>(n));
}

double wrms_norm_mask(N_Vector x, N_Vector w, N_Vector mask) {
  const double* xd = data(x);
  const double* wd = data(w);
  const double* md = data(mask);
  const std::size_t n = length(x);
  const double sum = sum_of(n, [xd, wd, md](std::size_t i) {
    const double weighted = md[i] > 0.0 ? xd[i] * wd[i] : 0.0;
    return weighted * weighted;
  });
  return std::sqrt(sum / static_cast<double>(n));
}

/// z += c x for pairs of terms at a time, so that z passes through the cache half as often.
void add_terms(int first, int n_vectors, const double* c, N_Vector* x, N_Vector z) {
  const std::size_t n = length(z);
  double* zd = data(z);
  int k = first;
  for (; k + 1 < n_vectors; k += 2) {
    const double c0 = c[k];
    const double c1 = c[k + 1];
    const double* x0 = data(x[k]);
    const double* x1 = data(x[k + 1]);
    SZ_ELEMENTWISE
    for (std::size_t i = 0; i < n; ++i) zd[i] += c0 * x0[i] + c1 * x1[i];
  }
  if (k < n_vectors) linear_sum(1.0, z, c[k], x[k], z);
}

int linear_combination(int n_vectors, double* c, N_Vector* x, N_Vector z) {
  if (n_vectors < 1) return -1;
  // SUNDIALS lets z be x[0], no other term.
  scale(c[0], x[0], z);
  add_terms(1, n_vectors, c, x, z);
  return 0;
}

int scale_add_multi(int n_vectors, double* a, N_Vector x, N_Vector* y, N_Vector* z) {
  if (n_vectors < 1) return -1;
  for (int k = 0; k < n_vectors; ++k) linear_sum(a[k], x, 1.0, y[k], z[k]);
  return 0;
}

int linear_sum_array(int n_vectors, double a, N_Vector* x, double b, N_Vector* y, N_Vector* z) {
  if (n_vectors < 1) return -1;
  for (int k = 0; k < n_vectors; ++k) linear_sum(a, x[k], b, y[k], z[k]);
  return 0;
}

int scale_array(int n_vectors, double* c, N_Vector* x, N_Vector* z) {
  if (n_vectors < 1) return -1;
  for (int k = 0; k < n_vectors; ++k) scale(c[k], x[k], z[k]);
  return 0;
}

int constant_array(int n_vectors, double c, N_Vector* z) {
  if (n_vectors < 1) return -1;
  for (int k = 0; k < n_vectors; ++k) constant(c, z[k]);
  return 0;
}

void take_over(N_Vector vector) {
  auto* ops = vector->ops;
  ops->nvlinearsum = linear_sum;
  ops->nvconst = constant;
  ops->nvprod = product;
  ops->nvdiv = quotient;
  ops->nvscale = scale;
  ops->nvabs = absolute;
  ops->nvinv = inverse;
  ops->nvaddconst = add_constant;
  ops->nvdotprod = dot_product;
  ops->nvmaxnorm = max_norm;
  ops->nvmin = least;
  ops->nvwrmsnorm = wrms_norm;
  ops->nvwrmsnormmask = wrms_norm_mask;
  ops->nvlinearcombination = linear_combination;
  ops->nvscaleaddmulti = scale_add_multi;
  ops->nvlinearsumvectorarray = linear_sum_array;
  ops->nvscalevectorarray = scale_array;
  ops->nvconstvectorarray = constant_array;
}

}  // namespace

FastVector::FastVector(std::size_t n, SUNContext context)
    : vector_(N_VNew_Serial(static_cast<sunindextype>(n), context)) {
  SZ_REQUIRE(vector_ != nullptr, "no vector of {} numbers", n);
  take_over(vector_);
}

FastVector::~FastVector() { N_VDestroy(vector_); }

std::span<double> FastVector::values() const { return values_of(vector_); }

std::span<double> values_of(N_Vector vector) { return {data(vector), length(vector)}; }

}  // namespace stillzone::core
