// Triangular dither for 16-bit output: the rounding error becomes a steady noise that does not follow the music.
//
// Triangular density from -1 to +1 step, the sum of two uniform ones: mean and variance of the total error are then
// independent of the signal (Lipshitz, Wannamaker and Vanderkooy, "Quantization and Dither: A Theoretical Survey",
// J. Audio Eng. Soc. 40(5), 1992). Does not shape the noise.
#pragma once

#include <cstdint>
#include <string_view>

namespace unsoldered {

/// The same seed gives the same numbers on every machine.
class TriangularDither {
 public:
  explicit TriangularDither(std::uint64_t seed) noexcept : state_(seed) {}

  /// The next number, in quantiser steps, strictly inside -1..1.
  double next() noexcept {
    // SplitMix64 (Steele, Lea and Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014).
    std::uint64_t z = (state_ += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    z ^= z >> 31;
    const auto first = static_cast<double>(static_cast<std::uint32_t>(z));
    const auto second = static_cast<double>(static_cast<std::uint32_t>(z >> 32));
    return (first - second) * 0x1p-32;
  }

 private:
  std::uint64_t state_;
};

/// A seed made from a name (64-bit FNV-1a), so that each clip has its own noise and a repeated render the same one.
std::uint64_t dither_seed(std::string_view name) noexcept;

}  // namespace unsoldered
