// Exact half-sample steps of a circuit for every position of one knob, laid out for the audio callback.
//
// A position between two rows takes their weighted mean. Each row is a contraction in the energy norm, so the mean is one
// too: no motion of the knob can make stored energy grow. Rows are laid over the element fraction (kinks in the taper cost
// nothing), closer together towards both ends, where the sections of the pot become short circuits:
// fraction = (1 - cos(pi row / (rows - 1))) / 2.
#pragma once

#include <vector>

#include "dsp/hookup.h"
#include "dsp/interpolator.h"

namespace unsoldered {

/// Where the parts of a row lie; columns of matrices are contiguous, padded to an even number of states.
struct RowLayout {
  int states = 0;
  int padded = 0;
  int transition = 0;
  int first_drive = 0;
  int second_drive = 0;
  int output = 0;
  int direct = 0;
  int size = 0;

  explicit RowLayout(int state_count);
};

class StepTable {
 public:
  /// Setup thread. Throws InputError when the hookup has no such knob or the network no solution.
  StepTable(const Hookup& hookup, Knob knob, double rate_hz);

  const RowLayout& layout() const noexcept { return layout_; }

  /// Row number, with the share of the next row as its fraction, of a dial 0..10. Audio thread.
  double position(double dial) const noexcept;

  /// The row at a position, written to row[0..layout().size-1]. Audio thread.
  void row_at(double position, double* row) const noexcept;

 private:
  RowLayout layout_;
  Pot pot_;
  bool open_at_ten_ = false;
  int rows_ = 0;  // without the one for the disconnected no-load position
  std::vector<double> data_;
};

}  // namespace unsoldered
