#include "dsp/step_table.h"

#include <algorithm>
#include <cmath>
#include <string>

#include "dsp/error.h"
#include "dsp/exact_step.h"
#include "dsp/hookup_network.h"
#include "dsp/interpolator.h"

namespace unsoldered {
namespace {

constexpr int row_count = 3072;
constexpr int most_states = 64;  // of the kernel's work space

double fraction_of(double place) {
  const double up = std::pow(place, 4);
  return up / (up + std::pow(1 - place, 4));
}

std::size_t moving_pot(const Network& network, Knob knob) {
  for (std::size_t i = 0; i < network.pots.size(); ++i)
    if (network.pots[i].knob == knob) return i;
  throw InputError("this hookup has no tone knob to turn; add a [tone] block or turn the volume");
}

RowLayout row_layout(int states) {
  RowLayout layout;
  layout.states = states;
  layout.padded = (states + 3) / 4 * 4;
  layout.first_drive = layout.padded * states;
  layout.second_drive = layout.first_drive + layout.padded * Interpolator::moments;
  layout.output = layout.second_drive + layout.padded * Interpolator::moments;
  layout.direct = layout.output + layout.padded;
  layout.size = (layout.direct + 1 + 3) / 4 * 4;
  return layout;
}

void write_row(const StateSpace& space, double rate_hz, const RowLayout& layout, double* row) {
  const HalfSteps steps = half_steps(space, rate_hz);
  for (int column = 0; column < layout.states; ++column)
    for (int i = 0; i < layout.states; ++i)
      row[layout.transition + column * layout.padded + i] = static_cast<double>(steps.transition(i, column));
  for (int p = 0; p < Interpolator::moments; ++p) {
    for (int i = 0; i < layout.states; ++i) {
      row[layout.first_drive + p * layout.padded + i] = static_cast<double>(steps.first_drive(i, p));
      row[layout.second_drive + p * layout.padded + i] = static_cast<double>(steps.second_drive(i, p));
    }
  }
  for (int i = 0; i < layout.states; ++i) row[layout.output + i] = static_cast<double>(space.c(i));
  row[layout.direct] = static_cast<double>(space.d);
}

}  // namespace

StepTable::StepTable(const Hookup& hookup, Knob knob, double rate_hz) : rows_(row_count) {
  const Network network = hookup_network(hookup);
  const std::size_t moving = moving_pot(network, knob);
  const StateSpaceFamily family(network, moving);
  if (family.states() > most_states)
    throw InputError("this hookup stores energy in " + std::to_string(family.states()) +
                     " independent ways; a turning knob is computed for up to " + std::to_string(most_states) +
                     ": leave out extra capacitors and inductors");
  layout_ = row_layout(family.states());
  pot_ = network.pots[moving].pot;
  open_at_ten_ = network.pots[moving].open_at_ten;
  const auto size = static_cast<std::size_t>(layout_.size);
  data_.assign(size * static_cast<std::size_t>(rows_ + 2), 0);
  for (int i = 0; i < rows_; ++i) {
    write_row(family.at(fraction_of(static_cast<double>(i) / (rows_ - 1))), rate_hz, layout_, data_.data() + size * static_cast<std::size_t>(i));
  }
  double* last = data_.data() + size * static_cast<std::size_t>(rows_);
  if (open_at_ten_)
    write_row(family.disconnected(), rate_hz, layout_, last);
  else
    std::copy_n(last - layout_.size, layout_.size, last);
}

double StepTable::position(double dial) const noexcept {
  if (open_at_ten_ && dial >= 10) return rows_;
  const double fraction = std::clamp(element_fraction(pot_, dial), 0.0, 1.0);
  const double up = std::sqrt(std::sqrt(fraction));
  const double down = std::sqrt(std::sqrt(1 - fraction));
  return up / (up + down) * (rows_ - 1);
}

}  // namespace unsoldered
