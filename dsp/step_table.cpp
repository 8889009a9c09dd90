#include "dsp/step_table.h"

#include <algorithm>
#include <cmath>
#include <string>

#include "dsp/error.h"
#include "dsp/exact_step.h"

namespace unsoldered {
namespace {

constexpr int moments = Interpolator::moments;
constexpr int rows_a_part = 3072;
constexpr int most_states = 64;  // of the kernel's work space

// A moving knob is taken as standing for short spans of the sample, in each where it is in the middle of that span. The
// last octave before the end, from 1/2 to 0 before it, then 1/4 to 1/8 and so on, are each cut into equal spans, so
// that they are short where a short time constant can see them: it forgets what came before.
constexpr int halvings = 6;  // the shortest span is 2^-halvings of a sample
constexpr int spans_an_octave = 2;

constexpr double full_turn_s = 0.05;
constexpr double most_speed_per_s = 200;  // places; a law with a jump in it has no steepest place

double fraction_of(double place) {
  const double up = std::pow(place, 4);
  return up / (up + std::pow(1 - place, 4));
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

StepTable::StepTable(const Circuit& circuit, const Knob& knob, double rate_hz) {
  const std::vector<PotPlace> moving = pots_of(circuit, knob);
  if (moving.empty()) throw InputError("this hookup has no such knob to turn; add its block or turn the volume");
  for (const PotPlace& place : moving) pots_.push_back(circuit.stages[place.stage].pots[place.pot]);
  halves_ = static_cast<int>(moving.size());
  pot_ = pots_.front().pot;
  if (pots_.front().backwards) std::swap(pot_.dead_ccw_deg, pot_.dead_cw_deg);
  open_at_ten_ = pots_.front().open_at_ten;
  const StateSpaceFamily family(circuit, moving);
  if (family.states() > most_states)
    throw InputError("this hookup stores energy in " + std::to_string(family.states()) +
                     " independent ways; a turning knob is computed for up to " + std::to_string(most_states) +
                     ": leave out extra capacitors and inductors");
  const int row_count = halves_ * (rows_a_part - 1) + 1;
  layout_ = row_layout(family.states());
  const double full_speed = full_speed_per_s() / rate_hz;  // places a sample
  samples_at_full_speed_ = 1 / full_speed;
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
    const StateSpace space = family.at(positions(place_of(i)));
    write_output(space, row_data(i));
    shortest.push_back(exact_step_in_double(space, shortest_s));
  }
  SpanSteps spans(std::move(shortest));

  // From the end of the sample to its start: each span comes before those already in the row.
  Step<double> span{Matrix<double>(layout_.states, layout_.states), Drive<double>(layout_.states, moments)};
  const auto put_before = [&](double start, double length) {
    const Polynomials<double> powers = chebyshev_powers(start, length);
    for (int i = 0; i < row_count; ++i) {
      const double place = place_of(i);
      for (const int direction : {1, -1}) {
        const double passed = (1 - start - length / 2) * full_speed * direction;
        spans.at(row_of(std::clamp(place - passed, 0.0, 1.0)), span);
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
    const StateSpace space = family.at({PotPosition{1, true}});
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

double StepTable::place(double dial) const noexcept {
  if (pots_.size() > 1) return 1 - electrical_travel(pot_, 10 - dial);  // the first of the two gangs runs backwards
  return std::clamp(element_fraction(pot_, pots_.front().backwards ? 10 - dial : dial), 0.0, 1.0);
}

std::vector<PotPosition> StepTable::positions(double place) const {
  if (pots_.size() == 1) return {{place, false}};
  std::vector<PotPosition> result;
  for (const PotInNetwork& gang : pots_) {
    Pot whole = gang.pot;
    whole.dead_ccw_deg = whole.dead_cw_deg = 0;
    result.push_back({element_fraction(whole, 10 * (gang.backwards ? 1 - place : place)), false});
  }
  return result;
}

double StepTable::place_of(int row) const noexcept {
  const int part = std::min(row / (rows_a_part - 1), halves_ - 1);
  const double inside = fraction_of(static_cast<double>(row - part * (rows_a_part - 1)) / (rows_a_part - 1));
  return (part + inside) / halves_;
}

double StepTable::row_of(double place) const noexcept {
  double row = 0;
  const double dial = 0;  // never at ten
  rows_at(&dial, &place, 1, &row);
  return row;
}

void StepTable::rows_at(const double* dials, const double* places, int frames, double* rows) const noexcept {
  if (halves_ == 1) {
    table_rows(places, frames, rows_a_part - 1, rows);
  } else {
    const auto part = [&](double place) { return std::min(static_cast<int>(place * halves_), halves_ - 1); };
    for (int n = 0; n < frames; ++n) rows[n] = places[n] * halves_ - part(places[n]);
    table_rows(rows, frames, rows_a_part - 1, rows);
    for (int n = 0; n < frames; ++n) rows[n] += part(places[n]) * (rows_a_part - 1);
  }
  if (!open_at_ten_) return;
  for (int n = 0; n < frames; ++n)
    if (dials[n] >= 10) rows[n] = halves_ * (rows_a_part - 1) + 1;
}

double StepTable::speed(double from, double to) const noexcept {
  return std::clamp((to - from) * samples_at_full_speed_, -1.0, 1.0);
}

/// Places a second, of a full turn where the law is steepest.
double StepTable::full_speed_per_s() const noexcept {
  constexpr int dials = 2000;
  double steepest = 1;
  for (int i = 0; i < dials; ++i)
    steepest = std::max(steepest, std::abs(place(10.0 * (i + 1) / dials) - place(10.0 * i / dials)) * dials);
  return std::min(steepest / full_turn_s, most_speed_per_s);
}

}  // namespace unsoldered
