// Loudness and true peak of a clip after ITU-R BS.1770-4, measured while it is rendered.
//
// Filters, block energies and the peak between samples come from libebur128. The gates are applied here, because they
// move with the gain: what a clip measures at any gain is answered without measuring again.
//
// Channel weights are those of the standard for the usual order of channels in a file: front ones 1, surround ones 1.41,
// a low-frequency channel (the fourth of six and more) 0. A mono file is one front channel: 997 Hz at 0 dBFS is
// -3.01 LUFS, and the same in both channels of a stereo file 0.
#pragma once

#include <ebur128.h>

#include <cstdint>
#include <memory>
#include <vector>

namespace unsoldered {

inline constexpr double kAbsoluteGateLufs = -70;
inline constexpr int kShortestGatedSeconds = 3;  // below, a clip is measured as a whole, ungated

/// What a whole clip measured; the gains are factors.
class Loudness {
 public:
  /// LUFS; -infinity when nothing lies above the absolute gate.
  double integrated_lufs(double gain = 1) const;

  /// Largest magnitude between the samples, full scale 1.
  double true_peak(double gain = 1) const noexcept { return true_peak_ * gain; }

 private:
  friend class LoudnessMeter;
  std::vector<double> energies_;  // mean square of the weighted signal in 400 ms, every 100 ms; one alone: ungated
  double true_peak_ = 0;
};

/// One thread.
class LoudnessMeter {
 public:
  LoudnessMeter(int rate_hz, int channels);

  /// Planar frames in order, full scale 1. Allocates.
  void add(const double* const* channels, int frames);

  /// Of the last 0.4 s and the last 3 s (EBU Tech 3341), without gates; -infinity for silence. What came before the first
  /// frame counts as silence.
  double momentary_lufs() const;
  double short_term_lufs() const;

  /// So far; the last 12 samples may still raise it.
  double true_peak() const;

  /// Once, after the last frame.
  Loudness finish();

 private:
  struct Closer {
    void operator()(ebur128_state* state) const noexcept { ebur128_destroy(&state); }
  };
  void add_interleaved(const double* samples, int frames);

  std::unique_ptr<ebur128_state, Closer> state_;
  int rate_hz_;
  int channels_;
  int step_frames_;  // between the starts of two blocks
  int until_block_;  // frames until the next block is complete
  std::int64_t frames_ = 0;
  std::vector<double> interleaved_;
  Loudness result_;
};

}  // namespace unsoldered
