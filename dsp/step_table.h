// Exact sample steps of a circuit for every position and speed of one knob, laid out for the audio callback.
//
// Rows are laid over the element fraction (kinks in the taper cost nothing), closer together towards both ends, where the
// sections of the pot become short circuits: fraction = p^4 / (p^4 + (1 - p)^4), p = row / (rows - 1). A blend of two gangs
// has such ends at the middle too; its rows are laid over the electrical travel, so in each half. Where the time
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

#include "dsp/kernels.h"
#include "dsp/network.h"
#include "dsp/state_space.h"

namespace unsoldered {

class StepTable {
 public:
  /// Setup thread. Throws InputError when the circuit has no such knob or no solution.
  StepTable(const Circuit& circuit, const Knob& knob, double rate_hz);

  const RowLayout& layout() const noexcept { return layout_; }

  /// Place of a dial 0..10 along the rows, 0..1: the element fraction RB/RT, or a blend's electrical travel. Audio thread, as
  /// all below.
  double place(double dial) const noexcept;

  /// Row numbers (their fraction: the share of the next row) of dials and their places.
  void rows_at(const double* dials, const double* places, int frames, double* rows) const noexcept;

  /// Speed of a knob that went from one place to another within a sample, -1..1 of full speed.
  double speed(double from, double to) const noexcept;

  /// All rows, layout().size numbers each, one row past the last position.
  const double* rows() const noexcept { return data_.data(); }

 private:
  double row_of(double place) const noexcept;
  double place_of(int row) const noexcept;
  std::vector<PotPosition> positions(double place) const;
  double full_speed_per_s() const noexcept;

  RowLayout layout_;
  std::vector<PotInNetwork> pots_;  // moved by the knob; more than one: a blend
  Pot pot_;                         // what tells the place of a dial
  bool open_at_ten_ = false;
  int halves_ = 1;                    // parts of the travel with rows of their own
  double samples_at_full_speed_ = 0;  // to pass all rows
  std::vector<double> data_;
};

}  // namespace unsoldered
