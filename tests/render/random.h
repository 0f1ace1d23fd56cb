// Random numbers for the renderer, the same on every machine.
//
// The engines of <random> are portable but its distributions are not: two standard libraries draw different normal
// numbers from one engine. Therefore engine and distributions are our own: splitmix64 (Steele, Lea, Flood 2014,
// "Fast splittable pseudorandom number generators", fig. 17) and Box-Muller (1958).
#pragma once

#include <cmath>
#include <cstdint>
#include <numbers>

namespace focusfall::render {

class Random {
 public:
  explicit Random(std::uint64_t key) : state_(key * 0xD1342543DE82EF95ULL + 0x2545F4914F6CDD1DULL) { bits(); }

  std::uint64_t bits() {
    std::uint64_t z = (state_ += 0x9E3779B97F4A7C15ULL);
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9ULL;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBULL;
    return z ^ (z >> 31);
  }

  // Uniform in [0, 1), 53 bits.
  double uniform() { return static_cast<double>(bits() >> 11) * 0x1.0p-53; }
  double uniform(double low, double high) { return low + (high - low) * uniform(); }
  // Uniform in the logarithm: equally often in every octave.
  double log_uniform(double low, double high) { return low * std::exp(uniform() * std::log(high / low)); }
  // 0 <= value < count; count far below 2^53.
  int below(int count) { return static_cast<int>(uniform() * count); }

  double normal() {
    if (has_spare_) {
      has_spare_ = false;
      return spare_;
    }
    const double radius = std::sqrt(-2.0 * std::log(1.0 - uniform()));
    const double angle = 2.0 * std::numbers::pi * uniform();
    spare_ = radius * std::sin(angle);
    has_spare_ = true;
    return radius * std::cos(angle);
  }

  // An independent stream for one purpose, so that adding a draw in one place does not shift all the others.
  Random branch(std::uint64_t purpose) { return Random(bits() ^ (purpose * 0x9E3779B97F4A7C15ULL)); }

 private:
  std::uint64_t state_;
  double spare_ = 0;
  bool has_spare_ = false;
};

}  // namespace focusfall::render
