#include "cli/report/sha256.hpp"

#include <array>
#include <bit>
#include <cstdint>

namespace stillzone::cli {

namespace {

using Word = std::uint32_t;

/// Whether n is prime, for n of at most a few hundred.
constexpr bool is_prime(Word n) {
  for (Word d = 2; d * d <= n; ++d) {
    if (n % d == 0) return false;
  }
  return n > 1;
}

/// First 32 bits of the fractional part of the square (degree 2) or cube (degree 3) root of n:
/// the largest whole r with r^degree <= n * 2^(32 degree), its low 32 bits.
constexpr Word root_fraction(Word n, int degree) {
  __extension__ typedef unsigned __int128 Wide;
  std::uint64_t root = 0;
  for (int bit = 36; bit >= 0; --bit) {
    const std::uint64_t trial = root | (std::uint64_t{1} << bit);
    const Wide square = static_cast<Wide>(trial) * trial;
    const Wide power = degree == 2 ? square : square * trial;
    if (power <= static_cast<Wide>(n) << (32 * degree)) root = trial;
  }
  return static_cast<Word>(root);
}

template <std::size_t N>
constexpr std::array<Word, N> prime_root_fractions(int degree) {
  std::array<Word, N> words{};
  std::size_t i = 0;
  for (Word n = 2; i < N; ++n) {
    if (is_prime(n)) words[i++] = root_fraction(n, degree);
  }
  return words;
}

constexpr std::array<Word, 64> kRound = prime_root_fractions<64>(3);
constexpr std::array<Word, 8> kStart = prime_root_fractions<8>(2);

void take_block(const unsigned char* block, std::array<Word, 8>& hash) {
  std::array<Word, 64> w{};
  for (std::size_t t = 0; t < 16; ++t) {
    for (std::size_t b = 0; b < 4; ++b) w[t] = (w[t] << 8U) | block[4 * t + b];
  }
  for (std::size_t t = 16; t < 64; ++t) {
    const Word s0 = std::rotr(w[t - 15], 7) ^ std::rotr(w[t - 15], 18) ^ (w[t - 15] >> 3U);
    const Word s1 = std::rotr(w[t - 2], 17) ^ std::rotr(w[t - 2], 19) ^ (w[t - 2] >> 10U);
    w[t] = w[t - 16] + s0 + w[t - 7] + s1;
  }
  auto [a, b, c, d, e, f, g, h] = hash;
  for (std::size_t t = 0; t < 64; ++t) {
    const Word s1 = std::rotr(e, 6) ^ std::rotr(e, 11) ^ std::rotr(e, 25);
    const Word t1 = h + s1 + ((e & f) ^ (~e & g)) + kRound[t] + w[t];
    const Word s0 = std::rotr(a, 2) ^ std::rotr(a, 13) ^ std::rotr(a, 22);
    const Word t2 = s0 + ((a & b) ^ (a & c) ^ (b & c));
    h = g;
    g = f;
    f = e;
    e = d + t1;
    d = c;
    c = b;
    b = a;
    a = t1 + t2;
  }
  const std::array<Word, 8> now{a, b, c, d, e, f, g, h};
  for (std::size_t i = 0; i < 8; ++i) hash[i] += now[i];
}

}  // namespace

std::string sha256_hex(std::string_view bytes) {
  std::string padded(bytes);
  padded += '\x80';
  while (padded.size() % 64 != 56) padded += '\0';
  const std::uint64_t n_bits = 8 * std::uint64_t{bytes.size()};
  for (int shift = 56; shift >= 0; shift -= 8) {
    padded += static_cast<char>((n_bits >> static_cast<unsigned>(shift)) & 0xFFU);
  }
  std::array<Word, 8> hash = kStart;
  std::array<unsigned char, 64> block{};
  for (std::size_t at = 0; at < padded.size(); at += 64) {
    for (std::size_t i = 0; i < 64; ++i) block[i] = static_cast<unsigned char>(padded[at + i]);
    take_block(block.data(), hash);
  }
  std::string hex;
  for (Word word : hash) {
    for (int shift = 28; shift >= 0; shift -= 4) {
      hex += "0123456789abcdef"[(word >> static_cast<unsigned>(shift)) & 0xFU];
    }
  }
  return hex;
}

}  // namespace stillzone::cli
