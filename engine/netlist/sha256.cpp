// SPDX-License-Identifier: MIT
#include "engine/netlist/sha256.h"

#include <fmt/format.h>

#include <array>
#include <bit>
#include <cmath>
#include <cstdint>

namespace couplet {
namespace {

/// First 32 bits of the fraction of a root of the n-th prime (FIPS 180-4, 4.2.2 and 5.3.3 define the
/// constants so).
std::uint32_t fraction(long double root) {
  return static_cast<std::uint32_t>((root - std::floor(root)) * 4294967296.0L);
}

std::array<int, 64> first_primes() {
  std::array<int, 64> primes{};
  int count = 0;
  for (int n = 2; count < 64; ++n) {
    bool prime = true;
    for (int i = 0; i < count && prime; ++i) prime = n % primes[i] != 0;
    if (prime) primes[count++] = n;
  }
  return primes;
}

}  // namespace

std::string sha256(const std::string& bytes) {
  static const auto primes = first_primes();
  std::array<std::uint32_t, 64> k{};
  std::array<std::uint32_t, 8> h{};
  for (int i = 0; i < 64; ++i) k[i] = fraction(std::cbrt(static_cast<long double>(primes[i])));
  for (int i = 0; i < 8; ++i) h[i] = fraction(std::sqrt(static_cast<long double>(primes[i])));
  std::string data = bytes + '\x80';
  data.append((120 - data.size() % 64) % 64, '\0');
  const std::uint64_t bits = static_cast<std::uint64_t>(bytes.size()) * 8;
  for (int i = 7; i >= 0; --i) data += static_cast<char>(bits >> (8 * i) & 0xFF);
  for (std::size_t block = 0; block < data.size(); block += 64) {
    std::array<std::uint32_t, 64> w{};
    for (int i = 0; i < 16; ++i) {
      for (int b = 0; b < 4; ++b) w[i] = w[i] << 8 | static_cast<unsigned char>(data[block + 4 * i + b]);
    }
    for (int i = 16; i < 64; ++i) {
      const auto s0 = std::rotr(w[i - 15], 7) ^ std::rotr(w[i - 15], 18) ^ w[i - 15] >> 3;
      const auto s1 = std::rotr(w[i - 2], 17) ^ std::rotr(w[i - 2], 19) ^ w[i - 2] >> 10;
      w[i] = w[i - 16] + s0 + w[i - 7] + s1;
    }
    auto v = h;
    for (int i = 0; i < 64; ++i) {
      const auto s1 = std::rotr(v[4], 6) ^ std::rotr(v[4], 11) ^ std::rotr(v[4], 25);
      const auto choice = (v[4] & v[5]) ^ (~v[4] & v[6]);
      const auto t1 = v[7] + s1 + choice + k[i] + w[i];
      const auto s0 = std::rotr(v[0], 2) ^ std::rotr(v[0], 13) ^ std::rotr(v[0], 22);
      const auto majority = (v[0] & v[1]) ^ (v[0] & v[2]) ^ (v[1] & v[2]);
      v = {t1 + s0 + majority, v[0], v[1], v[2], v[3] + t1, v[4], v[5], v[6]};
    }
    for (int i = 0; i < 8; ++i) h[i] += v[i];
  }
  std::string text;
  for (auto word : h) text += fmt::format("{:08x}", word);
  return text;
}

}  // namespace couplet
