#include "dsp/loudspeaker.h"

#include <cmath>

namespace unsoldered {
namespace {

constexpr double kResonanceHz = 75;
constexpr double kResonanceQ = 1.2;
constexpr double kPresenceHz = 2900;
constexpr double kPresenceQ = 1.3;
constexpr double kPresenceDb = 6;
constexpr double kTopHz = 5000;
constexpr double kTopQ[] = {0.541196100146197, 1.306562964876377};  // 1 / (2 cos 22.5 deg), 1 / (2 cos 67.5 deg)

}  // namespace

std::complex<double> loudspeaker_response(double hz) {
  // s / w is j hz / f, so each section is written in its own relative frequency.
  const auto damped = [&](double f, double q) {
    const std::complex<double> s(0, hz / f);
    return s * s + s / q + 1.0;
  };
  const std::complex<double> low(0, hz / kResonanceHz);
  std::complex<double> response = low * low / damped(kResonanceHz, kResonanceQ);
  response *= damped(kPresenceHz, kPresenceQ / std::pow(10, kPresenceDb / 20)) / damped(kPresenceHz, kPresenceQ);
  for (const double q : kTopQ) response /= damped(kTopHz, q);
  return response;
}

Fir loudspeaker_fir(double rate_hz) {
  return sample_response([&](double hz) { return upper_fade(hz, rate_hz) * loudspeaker_response(hz); }, rate_hz).fir;
}

}  // namespace unsoldered
