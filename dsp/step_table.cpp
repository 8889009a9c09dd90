#include "dsp/step_table.h"

#include <algorithm>
#include <cmath>
#include <string>

#include "dsp/error.h"
#include "dsp/exact_step.h"
#include "dsp/hookup_network.h"

namespace unsoldered {
namespace {

constexpr int moments = Interpolator::moments;
constexpr int row_count = 3072;
constexpr int most_states = 64;  // of the kernel's work space

// A moving knob is taken as standing for short spans of the sample, in each where it is in the middle of that span. The
// last octave before the end, from 1/2 to 0 before it, then 1/4 to 1/8 and so on, are each cut into equal spans, so
// that they are short where a short time constant can see them: it forgets what came before.
constexpr int halvings = 6;  // the shortest span is 2^-halvings of a sample
constexpr int spans_an_octave = 2;

constexpr double full_turn_s = 0.05;
constexpr double most_speed_per_s = 200;  // element fraction; a law with a jump in it has no steepest place

/// Element fraction a second, of a full turn where the law is steepest.
double full_speed_per_s(const Pot& pot) {
  constexpr int places = 2000;
  double steepest = 1;
  for (int i = 0; i < places; ++i) {
    const double rise = element_fraction(pot, 10.0 * (i + 1) / places) - element_fraction(pot, 10.0 * i / places);
    steepest = std::max(steepest, rise * places);
  }
  return std::min(steepest / full_turn_s, most_speed_per_s);
}

double fraction_of(double place) {
  const double up = std::pow(place, 4);
  return up / (up + std::pow(1 - place, 4));
}

double row_of(double fraction) {
  double row = 0;
  table_rows(&fraction, 1, row_count - 1, &row);
  return row;
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
  layout.drive = layout.padded * states;
  layout.step = layout.drive + layout.padded * moments;
  layout.output = 3 * layout.step;
  layout.direct = layout.output + layout.padded;
  layout.size = (layout.direct + 1 + 3) / 4 * 4;
  return layout;
}

using Packed = Eigen::Map<Eigen::MatrixXd, Eigen::Unaligned, Eigen::OuterStride<>>;

/// A step inside a row: drive in Chebyshev moments of the sample's interval.
struct RowStep {
  Packed transition;
  Packed drive;
  RowStep(const RowLayout& layout, double* step)
      : transition(step, layout.states, layout.states, Eigen::OuterStride<>(layout.padded)),
        drive(step + layout.drive, layout.states, moments, Eigen::OuterStride<>(layout.padded)) {}
};

/// What happens at the rows' positions over one and the same span, and between them.
class SpanSteps {
 public:
  explicit SpanSteps(std::vector<Step<double>> rows) : rows_(std::move(rows)) {}

  const Step<double>& row(int i) const { return rows_[static_cast<std::size_t>(i)]; }

  /// The mean of two rows, written to `step`.
  void at(double row, Step<double>& step) const {
    const int below = std::min(static_cast<int>(row), static_cast<int>(rows_.size()) - 2);
    const double share = row - below;
    const Step<double>& low = rows_[static_cast<std::size_t>(below)];
    const Step<double>& high = rows_[static_cast<std::size_t>(below) + 1];
    step.transition.noalias() = (1 - share) * low.transition + share * high.transition;
    step.drive.noalias() = (1 - share) * low.drive + share * high.drive;
  }

  void double_span() {
    for (Step<double>& step : rows_) step = doubled(step);
  }

 private:
  std::vector<Step<double>> rows_;
};

}  // namespace

StepTable::StepTable(const Hookup& hookup, Knob knob, double rate_hz) {
  const Network network = hookup_network(hookup);
  const std::size_t moving = moving_pot(network, knob);
  const StateSpaceFamily family(network, moving);
  if (family.states() > most_states)
    throw InputError("this hookup stores energy in " + std::to_string(family.states()) +
                     " independent ways; a turning knob is computed for up to " + std::to_string(most_states) +
                     ": leave out extra capacitors and inductors");
  layout_ = row_layout(family.states());
  pot_ = network.pots[moving].pot;
  const double full_speed = full_speed_per_s(pot_) / rate_hz;  // fraction a sample
  samples_at_full_speed_ = 1 / full_speed;
  open_at_ten_ = network.pots[moving].open_at_ten;
  const auto size = static_cast<std::size_t>(layout_.size);
  data_.assign(size * static_cast<std::size_t>(row_count + 2), 0);
  const auto row_data = [&](int row) { return data_.data() + size * static_cast<std::size_t>(row); };
  const auto write_output = [&](const StateSpace& space, double* row) {
    for (int i = 0; i < layout_.states; ++i) row[layout_.output + i] = static_cast<double>(space.c(i));
    row[layout_.direct] = static_cast<double>(space.d);
  };

  const Long shortest_s = std::ldexp(Long(1) / rate_hz, -halvings);
  std::vector<Step<double>> shortest;
  shortest.reserve(static_cast<std::size_t>(row_count));
  for (int i = 0; i < row_count; ++i) {
    const StateSpace space = family.at(fraction_of(static_cast<double>(i) / (row_count - 1)));
    write_output(space, row_data(i));
    shortest.push_back(exact_step_in_double(space, shortest_s));
  }
  SpanSteps spans(std::move(shortest));

  // From the end of the sample to its start: each span comes before those already in the row.
  Step<double> span{Matrix<double>(layout_.states, layout_.states), Drive<double>(layout_.states, moments)};
  const auto put_before = [&](double start, double length) {
    const Polynomials<double> powers = chebyshev_powers(start, length);
    for (int i = 0; i < row_count; ++i) {
      const double fraction = fraction_of(static_cast<double>(i) / (row_count - 1));
      for (const int direction : {1, -1}) {
        const double passed = (1 - start - length / 2) * full_speed * direction;
        spans.at(row_of(std::clamp(fraction - passed, 0.0, 1.0)), span);
        RowStep later(layout_, row_data(i) + (direction > 0 ? 1 : 2) * layout_.step);
        if (start + length == 1) {
          later.transition = span.transition;
          later.drive = span.drive.lazyProduct(powers);
        } else {
          later.drive += later.transition.lazyProduct(span.drive.lazyProduct(powers).eval());
          later.transition = later.transition.lazyProduct(span.transition).eval();
        }
      }
    }
  };
  double end = 1;
  const auto put_octave = [&](double length) {
    for (int i = 0; i < spans_an_octave; ++i, end -= length) put_before(end - length, length);
  };
  put_octave(std::ldexp(1.0, -halvings));
  for (int halving = halvings; halving > 0; --halving) {
    if (end > 0) put_octave(std::ldexp(1.0, -halving));
    spans.double_span();
  }
  const Polynomials<double> whole = chebyshev_powers(0.0, 1.0);
  for (int i = 0; i < row_count; ++i) {
    RowStep still(layout_, row_data(i));
    still.transition = spans.row(i).transition;
    still.drive = spans.row(i).drive.lazyProduct(whole);
  }

  double* last = row_data(row_count);
  if (open_at_ten_) {
    const StateSpace space = family.disconnected();
    write_output(space, last);
    const Step<double> step = exact_step_in_double(space, Long(1) / rate_hz);
    for (int arrival = 0; arrival < 3; ++arrival) {
      RowStep row(layout_, last + arrival * layout_.step);
      row.transition = step.transition;
      row.drive = step.drive.lazyProduct(whole);
    }
  } else {
    std::copy_n(last - layout_.size, layout_.size, last);
  }
}

double StepTable::fraction(double dial) const noexcept { return std::clamp(element_fraction(pot_, dial), 0.0, 1.0); }

void StepTable::rows_at(const double* dials, const double* fractions, int frames, double* rows) const noexcept {
  table_rows(fractions, frames, row_count - 1, rows);
  if (!open_at_ten_) return;
  for (int n = 0; n < frames; ++n)
    if (dials[n] >= 10) rows[n] = row_count;
}

double StepTable::speed(double from, double to) const noexcept {
  return std::clamp((to - from) * samples_at_full_speed_, -1.0, 1.0);
}

}  // namespace unsoldered
