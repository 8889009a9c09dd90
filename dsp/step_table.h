// Exact half-sample steps of a circuit for every position of one knob, laid out for the audio callback.
//
// A position between two rows takes their weighted mean. Each row is a contraction in the energy norm, so the mean is one
// too: no motion of the knob can make stored energy grow. Rows are laid over the element fraction (kinks in the taper cost
// nothing), closer together towards both ends, where the sections of the pot become short circuits:
// fraction = p^4 / (p^4 + (1 - p)^4), p = row / (rows - 1). Where the time constant of a section passes the length of a
// sample the steps bend most; there the rows lie half a per cent apart, which keeps their mean within -100 dB of exact.
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

  /// Row number, with the share of the next row as its fraction, of a dial 0..10. Audio thread.
  double position(double dial) const noexcept;

  /// All rows, layout().size numbers each, one row past the last position. Audio thread.
  const double* rows() const noexcept { return data_.data(); }

 private:
  RowLayout layout_;
  Pot pot_;
  bool open_at_ten_ = false;
  int rows_ = 0;  // without the one for the disconnected no-load position
  std::vector<double> data_;
};

}  // namespace unsoldered
