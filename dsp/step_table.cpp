#include "dsp/step_table.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "dsp/error.h"
#include "dsp/exact_step.h"
#include "dsp/hookup_network.h"
#include "dsp/kernels.h"

namespace unsoldered {
namespace {

constexpr int rows = 1024;

std::size_t moving_pot(const Network& network, Knob knob) {
  for (std::size_t i = 0; i < network.pots.size(); ++i)
    if (network.pots[i].knob == knob) return i;
  throw InputError("this hookup has no tone knob to turn; add a [tone] block or turn the volume");
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

RowLayout::RowLayout(int state_count) : states(state_count), padded((state_count + 3) / 4 * 4) {
  first_drive = transition + padded * states;
  second_drive = first_drive + padded * Interpolator::moments;
  output = second_drive + padded * Interpolator::moments;
  direct = output + padded;
  size = (direct + 1 + 3) / 4 * 4;
}

StepTable::StepTable(const Hookup& hookup, Knob knob, double rate_hz) : layout_(0), rows_(rows) {
  const Network network = hookup_network(hookup);
  const std::size_t moving = moving_pot(network, knob);
  const StateSpaceFamily family(network, moving);
  layout_ = RowLayout(family.states());
  pot_ = network.pots[moving].pot;
  open_at_ten_ = network.pots[moving].open_at_ten;
  const auto size = static_cast<std::size_t>(layout_.size);
  data_.assign(size * static_cast<std::size_t>(rows_ + 2), 0);
  for (int i = 0; i < rows_; ++i) {
    const double fraction = (1 - std::cos(std::numbers::pi * i / (rows_ - 1))) / 2;
    write_row(family.at(fraction), rate_hz, layout_, data_.data() + size * static_cast<std::size_t>(i));
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
  return std::acos(1 - 2 * fraction) * (rows_ - 1) / std::numbers::pi;
}

void StepTable::row_at(double position, double* row) const noexcept {
  const auto below = static_cast<std::size_t>(position);
  const double* lower = data_.data() + below * static_cast<std::size_t>(layout_.size);
  mix(lower, lower + layout_.size, position - static_cast<double>(below), row, layout_.size);
}

}  // namespace unsoldered
