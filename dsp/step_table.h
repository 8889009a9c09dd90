// Exact sample steps of a circuit for every position and speed of one knob, laid out for the audio callback.
//
// Rows are laid over the element fraction (kinks in the taper cost nothing), closer together towards both ends, where the
// sections of the pot become short circuits: fraction = p^4 / (p^4 + (1 - p)^4), p = row / (rows - 1). Where the time
// constant of a section passes the length of a sample the steps bend most; there the rows lie half a per cent apart, which
// keeps their mean within -100 dB of exact.
//
// A row holds three steps that end at its position: of a knob that stands there, and of one that arrives there rising or
// falling at full speed. A position and speed between them take the weighted mean. (A knob frozen for a sample, or
// for half of one, has no lag where the circuit's time constants are shorter than that, and misses -80 dB.)
//
// Every step is a contraction in the energy norm, so every mean of them is one too: no motion of the knob can make stored
// energy grow. Full speed is that of a full turn in 50 ms where the taper is steepest; faster motion is taken at full speed:
// bounded and without clicks, but near only.
#pragma once

#include <vector>

#include "dsp/hookup.h"
#include "dsp/kernels.h"

namespace unsoldered {

class StepTable {
 public:
  /// Setup thread. Throws InputError when the hookup has no such knob or the network no solution.
  StepTable(const Hookup& hookup, Knob knob, double rate_hz);

  const RowLayout& layout() const noexcept { return layout_; }

  /// Element fraction RB/RT of a dial 0..10. Audio thread, as all below.
  double fraction(double dial) const noexcept;

  /// Row numbers (their fraction: the share of the next row) of dials and their element fractions.
  void rows_at(const double* dials, const double* fractions, int frames, double* rows) const noexcept;

  /// Speed of a knob that went from one element fraction to another within a sample, -1..1 of full speed.
  double speed(double from, double to) const noexcept;

  /// All rows, layout().size numbers each, one row past the last position.
  const double* rows() const noexcept { return data_.data(); }

 private:
  RowLayout layout_;
  Pot pot_;
  bool open_at_ten_ = false;
  double samples_at_full_speed_ = 0;  // to pass the whole element
  std::vector<double> data_;
};

}  // namespace unsoldered
