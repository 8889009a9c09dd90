// The sound of a hookup while one of its knobs turns. Same code live and offline.
//
// Does not smooth the knob: dial positions are taken as given, one a frame (smoothing a hand is the engine's business).
#pragma once

#include <memory>

#include "dsp/hookup.h"
#include "dsp/network.h"

namespace unsoldered {

/// Planar samples, several channels, double inside.
class MovingPotFilter {
 public:
  /// Setup thread; allocates everything. `rate_hz` 8000..384000, `channels` >= 1. Any block size. All other knobs stay at
  /// their dials. Throws InputError when the circuit has no such knob or no solution.
  MovingPotFilter(const Circuit& circuit, const Knob& knob, double rate_hz, int channels);

  /// Of the source that a take drives.
  MovingPotFilter(const Hookup& hookup, const Knob& knob, double rate_hz, int channels);
  ~MovingPotFilter();
  MovingPotFilter(MovingPotFilter&&) noexcept;
  MovingPotFilter& operator=(MovingPotFilter&&) noexcept;

  /// Output frame n is the circuit's answer to the input up to frame n - latency_frames().
  int latency_frames() const noexcept;

  /// Audio thread: no allocation, lock or system call. `dials[n]` (0..10) is the knob at the instant of output frame n,
  /// so offline, with the latency to be cut away, it is the dial at take time n - latency. in[channel][frame]; out may be in.
  void process(const double* const* in, double* const* out, int frames, const double* dials) noexcept;

  /// Back to silence.
  void reset() noexcept;

  /// Energy in the capacitors and inductors of one channel, joule for an input in volt. Audio thread.
  double stored_energy_j(int channel) const noexcept;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// The same with every knob held: cheaper, same latency, agrees with MovingPotFilter within -100 dB.
class HeldPotFilter {
 public:
  /// Every knob at its dial. As above otherwise.
  HeldPotFilter(const Circuit& circuit, double rate_hz, int channels);

  /// The volume at `dial`, everything else at its own.
  HeldPotFilter(const Hookup& hookup, double dial, double rate_hz, int channels);
  ~HeldPotFilter();
  HeldPotFilter(HeldPotFilter&&) noexcept;
  HeldPotFilter& operator=(HeldPotFilter&&) noexcept;
  int latency_frames() const noexcept;
  void process(const double* const* in, double* const* out, int frames) noexcept;
  void reset() noexcept;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace unsoldered
