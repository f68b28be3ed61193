// Compiled with AVX2 and FMA where the compiler has them (kinetics/CMakeLists.txt), and run only
// where the processor has them. No inline function of a library may be called from here.
#include "kinetics/tape_machine.hpp"

#if defined(__AVX2__) && defined(__FMA__)

#include <immintrin.h>

#include "kinetics/tape_kernel.hpp"

namespace stillzone::kinetics {

namespace {

struct Avx2 {
  static constexpr bool kFused = true;

  template <int n>
  [[gnu::always_inline]] static inline __m256d fused(__m256d a, __m256d b, __m256d c) {
    static_assert(n == 4);
    return _mm256_fmadd_pd(a, b, c);
  }

  [[gnu::always_inline]] static inline void turn4(const double* r0, const double* r1,
                                                  const double* r2, const double* r3, double* c0,
                                                  double* c1, double* c2, double* c3) {
    const __m256d a = _mm256_loadu_pd(r0);
    const __m256d b = _mm256_loadu_pd(r1);
    const __m256d c = _mm256_loadu_pd(r2);
    const __m256d d = _mm256_loadu_pd(r3);
    const __m256d ab_even = _mm256_unpacklo_pd(a, b);
    const __m256d ab_odd = _mm256_unpackhi_pd(a, b);
    const __m256d cd_even = _mm256_unpacklo_pd(c, d);
    const __m256d cd_odd = _mm256_unpackhi_pd(c, d);
    _mm256_storeu_pd(c0, _mm256_permute2f128_pd(ab_even, cd_even, 0x20));
    _mm256_storeu_pd(c1, _mm256_permute2f128_pd(ab_odd, cd_odd, 0x20));
    _mm256_storeu_pd(c2, _mm256_permute2f128_pd(ab_even, cd_even, 0x31));
    _mm256_storeu_pd(c3, _mm256_permute2f128_pd(ab_odd, cd_odd, 0x31));
  }
};

constexpr TapeMachineCode kCode = machine_code<Avx2, 4>();

}  // namespace

const TapeMachineCode* avx2_machine_code() {
  return __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma") ? &kCode : nullptr;
}

}  // namespace stillzone::kinetics

#else

namespace stillzone::kinetics {

const TapeMachineCode* avx2_machine_code() { return nullptr; }

}  // namespace stillzone::kinetics

#endif
