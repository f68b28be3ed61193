#pragma once

#include <array>
#include <cmath>
#include <complex>
#include <cstddef>
#include <span>
#include <utility>
#include <vector>

#include "core/dual_number.hpp"
#include "network/tracer/gamma_law.hpp"
#include "network/tracer/laplace_inversion.hpp"

// The candidates in dimensionless form: theta in nominal turnovers, volumes as fractions of the
// nominal volume, flows as fractions of the flow. Each states the transform of E for complex s; the
// responses follow in closed form, or from the transform where there is none.
namespace stillzone::network::candidates {

template <std::size_t N>
using Real = core::Dual<double, N>;
template <std::size_t N>
using Parameters = std::array<Real<N>, N>;
template <std::size_t N>
using Impulses = std::vector<std::pair<double, Real<N>>>;

/// 1 - exp(-theta / v) and its density: one mixed tank of volume v.
template <std::size_t N>
Real<N> tank_step(const Real<N>& v, double theta) {
  return -expm1(Real<N>(-theta) / v);
}
template <std::size_t N>
Real<N> tank_density(const Real<N>& v, double theta) {
  return exp(Real<N>(-theta) / v) / v;
}

struct OneTank {
  static constexpr std::size_t n = 1;  // volume
  using P = Parameters<n>;
  static Real<n> step(const P& p, double theta) { return tank_step(p[0], theta); }
  static Real<n> density(const P& p, double theta) { return tank_density(p[0], theta); }
  static Impulses<n> impulses(const P& /*p*/) { return {}; }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    return T(1.0) / (T(1.0) + s * p[0]);
  }
  static Real<n> mean(const P& p) { return p[0]; }
  static Real<n> variance(const P& p) { return p[0] * p[0]; }
};

/// E = (N/v)^N theta^(N-1) exp(-N theta/v) / Gamma(N), N real: MacMullin and Weber (1935), Trans.
/// AIChE 31:409; real N by the gamma law, Buffham and Gibilaro (1968), AIChE J. 14:805.
struct TanksInSeries {
  static constexpr std::size_t n = 2;  // volume, tanks
  using P = Parameters<n>;
  static Real<n> step(const P& p, double theta) {
    return gamma_cumulative(p[1], p[1] * Real<n>(theta) / p[0]);
  }
  static Real<n> density(const P& p, double theta) {
    return gamma_density(p[1], p[1] * Real<n>(theta) / p[0]) * p[1] / p[0];
  }
  static Impulses<n> impulses(const P& /*p*/) { return {}; }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    return exp(-p[1] * log(T(1.0) + s * p[0] / p[1]));
  }
  static Real<n> mean(const P& p) { return p[0]; }
  static Real<n> variance(const P& p) { return p[0] * p[0] / p[1]; }
};

/// E = b delta + ((1-b)^2/m) exp(-(1-b) theta/m): Cholette and Cloutier (1959), Can. J. Chem. Eng.
/// 37:105-112, their tank with short-circuit and dead space.
struct BypassDead {
  static constexpr std::size_t n = 2;  // mixed_fraction, bypass_fraction
  using P = Parameters<n>;
  static Real<n> through(const P& p) { return Real<n>(1.0) - p[1]; }
  static Real<n> step(const P& p, double theta) {
    return p[1] + through(p) * tank_step(p[0] / through(p), theta);
  }
  static Real<n> density(const P& p, double theta) {
    return through(p) * tank_density(p[0] / through(p), theta);
  }
  static Impulses<n> impulses(const P& p) { return {{0.0, p[1]}}; }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    const T through = T(1.0) - p[1];
    return p[1] + through / (T(1.0) + s * p[0] / through);
  }
  static Real<n> mean(const P& p) { return p[0]; }
  static Real<n> variance(const P& p) {
    return p[0] * p[0] * (Real<n>(2.0) / through(p) - Real<n>(1.0));
  }
};

/// A mixed zone m that exchanges q (as a fraction b of the flow) with a stagnant zone 1 - m:
///   m C1' = in - (1 + b) C1 + b C2,  (1 - m) C2' = b (C1 - C2).
struct StagnantExchange {
  static constexpr std::size_t n = 2;  // mixed_fraction, exchange_flow
  using P = Parameters<n>;
  struct Modes {
    Real<n> rate1, rate2;    // decay rates > 0
    Real<n> share1, share2;  // of the step response
  };
  static Modes modes(const P& p) {
    const Real<n> one(1.0);
    const Real<n> a = (one + p[1]) / p[0];
    const Real<n> d = p[1] / (one - p[0]);
    const Real<n> product = p[1] / (p[0] * (one - p[0]));
    const Real<n> difference = a - d;
    const Real<n> root =
        sqrt(difference * difference + Real<n>(4.0) * p[1] * p[1] / (p[0] * (one - p[0])));
    Modes modes;
    modes.rate2 = Real<n>(0.5) * (a + d + root);
    modes.rate1 = product / modes.rate2;  // no cancellation
    // E = sum of A_i exp(-rate_i theta), A1 = (d - rate1)/(rate2 - rate1)/m and so on.
    const Real<n> gap = root * p[0];
    modes.share1 = (d - modes.rate1) / gap / modes.rate1;
    modes.share2 = (modes.rate2 - d) / gap / modes.rate2;
    return modes;
  }
  static Real<n> step(const P& p, double theta) {
    const Modes m = modes(p);
    return -m.share1 * expm1(-m.rate1 * Real<n>(theta)) -
           m.share2 * expm1(-m.rate2 * Real<n>(theta));
  }
  static Real<n> density(const P& p, double theta) {
    const Modes m = modes(p);
    return m.share1 * m.rate1 * exp(-m.rate1 * Real<n>(theta)) +
           m.share2 * m.rate2 * exp(-m.rate2 * Real<n>(theta));
  }
  static Impulses<n> impulses(const P& /*p*/) { return {}; }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    const T still = T(1.0) - p[0];
    return T(1.0) / (T(1.0) + s * p[0] + s * still / (T(1.0) + s * still / p[1]));
  }
  static Real<n> mean(const P& /*p*/) { return {1.0}; }
  static Real<n> variance(const P& p) {
    const Real<n> still = Real<n>(1.0) - p[0];
    return Real<n>(1.0) + Real<n>(2.0) * still * still / p[1];
  }
};

/// Responses by numerical inversion, for candidates without a closed form in time.
template <class Candidate, std::size_t N>
struct ByInversion {
  using P = Parameters<N>;
  static std::array<core::Dual<std::complex<double>, N>, N> on_plane(const P& p) {
    std::array<core::Dual<std::complex<double>, N>, N> image;
    for (std::size_t j = 0; j < N; ++j) image[j] = core::to_complex(p[j]);
    return image;
  }
  /// Inverts E(s) / s^power.
  static Real<N> inverted(const P& p, double theta, int power) {
    if (theta <= 0.0) return {0.0};
    const auto parameters = on_plane(p);
    return invert_laplace<N>(
        Candidate::rule(p),
        [&](const core::Dual<std::complex<double>, N>& s) {
          auto image = Candidate::transform(parameters, s);
          for (int k = 0; k < power; ++k) image = image / s;
          return image;
        },
        theta);
  }
  static Real<N> step(const P& p, double theta) { return inverted(p, theta, 1); }
  static Real<N> density(const P& p, double theta) { return inverted(p, theta, 0); }
  static Impulses<N> impulses(const P& /*p*/) { return {}; }
};

/// N equal tanks in series, N real, each with its share of the mixed and the stagnant volume and of
/// the exchange: transform = (that of one such tank)^N.
struct SeriesStagnant : ByInversion<SeriesStagnant, 3> {
  static constexpr std::size_t n = 3;  // tanks, mixed_fraction, exchange_flow
  using P = Parameters<n>;
  /// Many tanks make a front, which takes more nodes.
  static const TalbotRule& rule(const P& p) {
    static const TalbotRule kFew(32);
    static const TalbotRule kMany(56);
    return p[0].value < 5.0 ? kFew : kMany;
  }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    const T still = T(1.0) - p[1];
    const T one_tank = T(1.0) + s / p[0] * (p[1] + still / (T(1.0) + s * still / p[2]));
    return exp(-p[0] * log(one_tank));
  }
  static Real<n> mean(const P& /*p*/) { return {1.0}; }
  static Real<n> variance(const P& p) {
    const Real<n> still = Real<n>(1.0) - p[1];
    return Real<n>(1.0) / p[0] + Real<n>(2.0) * still * still / p[2];
  }
};

/// A plug section, then a mixed tank: E = exp(-(theta - p v)/((1 - p) v)) / ((1 - p) v), theta >= p
/// v.
struct PlugTank {
  static constexpr std::size_t n = 2;  // volume, plug_fraction
  using P = Parameters<n>;
  static Real<n> front(const P& p) { return p[0] * p[1]; }
  static Real<n> tank(const P& p) { return p[0] * (Real<n>(1.0) - p[1]); }
  static Real<n> after(const P& p, double theta) { return Real<n>(theta) - front(p); }
  static Real<n> step(const P& p, double theta) {
    if (theta < front(p).value) return {0.0};
    return -expm1(-after(p, theta) / tank(p));
  }
  static Real<n> density(const P& p, double theta) {
    if (theta < front(p).value) return {0.0};
    return exp(-after(p, theta) / tank(p)) / tank(p);
  }
  static Impulses<n> impulses(const P& /*p*/) { return {}; }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    return exp(-s * p[0] * p[1]) / (T(1.0) + s * p[0] * (T(1.0) - p[1]));
  }
  static Real<n> mean(const P& p) { return p[0]; }
  static Real<n> variance(const P& p) { return tank(p) * tank(p); }
};

/// Two mixed tanks side by side: the fast one takes the flow fraction f and the volume fraction g.
struct ParallelPaths {
  static constexpr std::size_t n = 3;  // volume, fast_flow_fraction, fast_volume_fraction
  using P = Parameters<n>;
  /// The fast path is the one with less volume for its flow.
  static void settle_names(std::span<double> p) {
    if (p[2] <= p[1]) return;
    p[1] = 1.0 - p[1];
    p[2] = 1.0 - p[2];
  }
  static Real<n> fast(const P& p) { return p[0] * p[2] / p[1]; }
  static Real<n> slow(const P& p) { return p[0] * (Real<n>(1.0) - p[2]) / (Real<n>(1.0) - p[1]); }
  template <class Response>
  static Real<n> both(const P& p, const Response& response) {
    return p[1] * response(fast(p)) + (Real<n>(1.0) - p[1]) * response(slow(p));
  }
  static Real<n> step(const P& p, double theta) {
    return both(p, [&](const Real<n>& v) { return tank_step(v, theta); });
  }
  static Real<n> density(const P& p, double theta) {
    return both(p, [&](const Real<n>& v) { return tank_density(v, theta); });
  }
  static Impulses<n> impulses(const P& /*p*/) { return {}; }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    const T fast = p[0] * p[2] / p[1];
    const T slow = p[0] * (T(1.0) - p[2]) / (T(1.0) - p[1]);
    return p[1] / (T(1.0) + s * fast) + (T(1.0) - p[1]) / (T(1.0) + s * slow);
  }
  static Real<n> mean(const P& p) { return p[0]; }
  static Real<n> variance(const P& p) {
    const Real<n> second = both(p, [](const Real<n>& v) { return Real<n>(2.0) * v * v; });
    return second - p[0] * p[0];
  }
};

/// Axial dispersion between closed ends: transform 4 a e^{Pe(1-a)/2} / ((1+a)^2 - (1-a)^2 e^{-a
/// Pe}), a = sqrt(1 + 4 s v / Pe). Danckwerts (1953), Chem. Eng. Sci. 2:1; Wehner and Wilhelm
/// (1956), Chem. Eng. Sci. 6:89; variance van der Laan (1958), Chem. Eng. Sci. 7:187.
struct Dispersion : ByInversion<Dispersion, 2> {
  static constexpr std::size_t n = 2;  // volume, peclet
  using P = Parameters<n>;
  /// A high Peclet number makes a front, which takes more nodes.
  static const TalbotRule& rule(const P& p) {
    static const TalbotRule kFew(32);
    static const TalbotRule kMany(56);
    return p[1].value < 10.0 ? kFew : kMany;
  }
  template <class T>
  static T transform(const std::array<T, n>& p, const T& s) {
    const T one(1.0);
    const T a = sqrt(one + T(4.0) * s * p[0] / p[1]);
    return T(4.0) * a * exp(T(0.5) * p[1] * (one - a)) /
           ((one + a) * (one + a) - (one - a) * (one - a) * exp(-a * p[1]));
  }
  static Real<n> mean(const P& p) { return p[0]; }
  static Real<n> variance(const P& p) {
    const Real<n> pe = p[1];
    return p[0] * p[0] * Real<n>(2.0) / pe * (Real<n>(1.0) + expm1(-pe) / pe);
  }
};

}  // namespace stillzone::network::candidates
