#include "dsp/several_knobs_filter.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "dsp/denormals.h"
#include "dsp/error.h"
#include "dsp/exact_step.h"
#include "dsp/history.h"
#include "dsp/interpolator.h"
#include "dsp/kernels.h"

namespace unsoldered {
namespace {

// A moving knob is taken as standing for parts of the sample, short ones towards its end where a short time constant can
// see them. A slow one (a full turn in several seconds) for the two halves: the lag it then misses is below -100 dB.
constexpr std::array kFastParts = {0.25, 0.25, 0.125, 0.125, 0.125, 0.125};
constexpr std::array kSlowParts = {0.5, 0.5};
constexpr double kSlow = 2e-5;  // of the whole dial, a sample

// Steps are computed where some pot has moved on by a row of what would be its step table, and mixed between; as there, the
// mean of contractions is one. Between the two the pots have to move evenly.
constexpr double kRows = 3071;
constexpr double kUneven = 0.02;  // rows
constexpr int kLongest = 64;      // samples

struct WholeStep {
  Eigen::MatrixXd transition;
  Drive<double> drive;  // Chebyshev moments of the sample's interval
  Eigen::RowVectorXd output;
  double direct = 0;
};

void mix(const WholeStep& from, const WholeStep& to, double share, WholeStep& step) {
  step.transition = (1 - share) * from.transition + share * to.transition;
  step.drive = (1 - share) * from.drive + share * to.drive;
  step.output = (1 - share) * from.output + share * to.output;
  step.direct = (1 - share) * from.direct + share * to.direct;
}

}  // namespace

struct SeveralKnobsFilter::State {
  static constexpr int block = 128;
  using Dials = std::vector<double>;  // one a knob

  Interpolator interpolator;
  double rate_hz;
  std::vector<std::pair<PotInNetwork, std::size_t>> pots;  // and the knob that moves it
  StateSpaceFamily family;
  std::vector<History> history;
  std::vector<Eigen::VectorXd> states;  // by channel
  std::vector<std::vector<double>> moments;
  Dials at;
  bool at_rest = true;
  bool standing = false;  // `step` is that of knobs standing at `at`
  WholeStep step;         // of the sample computed last
  WholeStep before;       // of the one computed before that
  WholeStep mixed;
  std::vector<std::vector<double>> rows;  // by pot: of the two samples before a block, then of the block

  static std::vector<PotPlace> places(const Circuit& circuit, const std::vector<Knob>& knobs) {
    std::vector<PotPlace> all;
    for (const Knob& knob : knobs) {
      const std::vector<PotPlace> own = pots_of(circuit, knob);
      if (own.empty()) throw InputError("this hookup has no such knob to turn; add its block or turn another");
      all.insert(all.end(), own.begin(), own.end());
    }
    return all;
  }

  State(const Circuit& circuit, const std::vector<Knob>& knobs, double rate, int channels)
      : interpolator(rate), rate_hz(rate), family(circuit, places(circuit, knobs)), at(knobs.size(), 0) {
    for (std::size_t k = 0; k < knobs.size(); ++k)
      for (const PotPlace& place : pots_of(circuit, knobs[k]))
        pots.emplace_back(circuit.stages[place.stage].pots[place.pot], k);
    const auto count = static_cast<std::size_t>(channels);
    history.assign(count, History(interpolator.taps(), block));
    states.assign(count, Eigen::VectorXd::Zero(family.states()));
    moments.assign(count, std::vector<double>(static_cast<std::size_t>(Interpolator::moments) * block));
    rows.assign(pots.size(), std::vector<double>(2 + block, -1));
  }

  std::vector<PotPosition> positions(const Dials& dials) const {
    std::vector<PotPosition> result;
    for (const auto& [pot, knob] : pots)
      result.push_back({std::clamp(fraction_below(pot, dials[knob]), 0.0, 1.0), is_open(pot, dials[knob])});
    return result;
  }

  Dials between(const Dials& from, const Dials& to, double share) const {
    Dials result(from.size());
    for (std::size_t k = 0; k < from.size(); ++k) result[k] = from[k] + share * (to[k] - from[k]);
    return result;
  }

  void set_output(const StateSpace& space) {
    step.output = space.c.cast<double>();
    step.direct = static_cast<double>(space.d);
  }

  void stand(const Dials& dials) {
    const StateSpace space = family.at(positions(dials));
    const Step<double> whole = exact_step_in_double(space, 1 / static_cast<Long>(rate_hz));
    step.transition = whole.transition;
    step.drive = whole.drive * chebyshev_powers(0.0, 1.0);
    set_output(space);
  }

  template <typename Parts>
  void move(const Dials& from, const Dials& to, const Parts& parts) {
    double start = 0;
    const Eigen::Index size = family.states();
    step.transition = Eigen::MatrixXd::Identity(size, size);
    step.drive = Drive<double>::Zero(size, Interpolator::moments);
    for (const double length : parts) {
      const StateSpace space = family.at(positions(between(from, to, start + length / 2)));
      const Step<double> part = exact_step_in_double(space, static_cast<Long>(length) / static_cast<Long>(rate_hz));
      step.drive = (part.transition * step.drive + part.drive * chebyshev_powers(start, length)).eval();
      step.transition = (part.transition * step.transition).eval();
      start += length;
    }
    set_output(family.at(positions(to)));
  }

  void advance(const Dials& to) {
    if (to == at) {
      if (!standing) stand(to);
      standing = true;
      return;
    }
    double speed = 0;
    for (std::size_t k = 0; k < to.size(); ++k) speed = std::max(speed, std::abs(to[k] - at[k]) / 10);
    if (speed < kSlow)
      move(at, to, kSlowParts);
    else
      move(at, to, kFastParts);
    at = to;
    standing = false;
  }

  void follow(int frames, const double* const* dials, int offset) {
    for (std::size_t i = 0; i < pots.size(); ++i) {
      const auto& [pot, knob] = pots[i];
      std::vector<double>& row = rows[i];
      const auto row_at = [&](double dial) {
        const double fraction = std::clamp(fraction_below(pot, dial), 0.0, 1.0);
        double found = 0;
        table_rows(&fraction, 1, kRows, &found);
        return is_open(pot, dial) ? found + 10 : found;  // a jump, never mixed with what is connected
      };
      if (at_rest) row[0] = row[1] = row_at(dials[knob][offset]);
      for (int n = 0; n < frames; ++n) row[static_cast<std::size_t>(n) + 2] = row_at(dials[knob][offset + n]);
    }
  }

  /// How many samples from sample `first` on (which is `first + 2` in `rows`) move evenly with the one before them.
  int even_samples(int first, int left) const {
    for (int length = std::min(left, kLongest); length > 1; length /= 2) {
      bool even = true;
      for (const std::vector<double>& row : rows) {
        const double* from = row.data() + first + 1;
        const double slope = (from[length] - from[0]) / length;
        even = even && std::abs(from[length] - from[0]) <= 1;
        for (int n = -1; even && n < length; ++n) even = std::abs(from[0] + n * slope - from[n]) <= kUneven;
      }
      if (even) return length;
    }
    return 1;
  }

  void process(const double* const* in, double* const* out, int frames, const double* const* dials, int offset) {
    for (std::size_t channel = 0; channel < history.size(); ++channel) {
      history[channel].push(in[channel] + offset, frames);
      interpolator.process(history[channel].newest(), frames, moments[channel].data(), block);
    }
    follow(frames, dials, offset);
    const auto dials_at = [&](int n) {
      Dials now(at.size());
      for (std::size_t k = 0; k < now.size(); ++k) now[k] = dials[k][offset + n];
      return now;
    };
    for (int n = 0; n < frames;) {
      const int length = at_rest ? 1 : even_samples(n, frames - n);
      if (at_rest) at = dials_at(0);
      at_rest = false;
      const bool stood = standing;
      before = step;
      if (length > 1) {
        Dials before_last = dials_at(n + length - 2);
        standing = standing && before_last == at;
        at = std::move(before_last);
      }
      advance(dials_at(n + length - 1));
      for (int i = 1; i < length; ++i) {
        if (stood && standing) {  // nothing has moved
          play(step, n + i - 1, out, offset);
          continue;
        }
        mix(before, step, static_cast<double>(i) / length, mixed);
        play(mixed, n + i - 1, out, offset);
      }
      play(step, n + length - 1, out, offset);
      n += length;
    }
    for (std::vector<double>& row : rows) std::copy_n(row.begin() + frames, 2, row.begin());
    for (History& past : history) past.keep(frames);
  }

  void play(const WholeStep& now, int n, double* const* out, int offset) {
    Eigen::Matrix<double, Interpolator::moments, 1> moment;
    for (std::size_t channel = 0; channel < history.size(); ++channel) {
      for (int p = 0; p < Interpolator::moments; ++p)
        moment(p) = moments[channel][static_cast<std::size_t>(p * block + n)];
      Eigen::VectorXd& state = states[channel];
      state = (now.transition * state + now.drive * moment).eval();
      const double direct = now.direct * history[channel].newest()[n - interpolator.latency()];
      out[channel][offset + n] = (state.size() == 0 ? 0.0 : now.output.dot(state)) + direct;
    }
  }
};

SeveralKnobsFilter::SeveralKnobsFilter(const Circuit& circuit, const std::vector<Knob>& knobs, double rate_hz,
                                       int channels)
    : state_(std::make_unique<State>(circuit, knobs, rate_hz, channels)) {}
SeveralKnobsFilter::~SeveralKnobsFilter() = default;
SeveralKnobsFilter::SeveralKnobsFilter(SeveralKnobsFilter&&) noexcept = default;
SeveralKnobsFilter& SeveralKnobsFilter::operator=(SeveralKnobsFilter&&) noexcept = default;

int SeveralKnobsFilter::latency_frames() const noexcept { return state_->interpolator.latency(); }

void SeveralKnobsFilter::process(const double* const* in, double* const* out, int frames, const double* const* dials) {
  const DenormalsOff guard;
  for (int done = 0; done < frames; done += State::block)
    state_->process(in, out, std::min(State::block, frames - done), dials, done);
}

}  // namespace unsoldered
