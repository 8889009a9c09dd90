// The take that is always there: a short phrase of plucked strings, computed. Our own melody.
//
// Strings: extended plucked-string algorithm of Jaffe and Smith, "Extensions of the Karplus-Strong Plucked-String
// Algorithm", Computer Music Journal 7(2), 1983. Bright on purpose (partials past 15 kHz), so that lost treble is heard.
#pragma once

#include <vector>

#include "src/take.h"

namespace unsoldered {

/// Mono, 48 kHz, about nine seconds, peak -6 dBFS, starts and ends at zero; the same samples every time.
class BuiltInTake : public Take {
 public:
  TakeFormat format() const noexcept override;
  int read(double* interleaved, int frames) override;

 private:
  std::size_t next_ = 0;
};

/// The whole phrase, computed at the first call; any thread.
const std::vector<double>& built_in_phrase();

}  // namespace unsoldered
