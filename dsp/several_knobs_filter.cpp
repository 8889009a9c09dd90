#include "dsp/several_knobs_filter.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "dsp/denormals.h"
#include "dsp/error.h"
#include "dsp/exact_step.h"
#include "dsp/history.h"
#include "dsp/interpolator.h"

namespace unsoldered {
namespace {

// A moving knob is taken as standing for parts of the sample, short ones towards its end where a short time constant can
// see them. A slow one (a full turn in several seconds) for the two halves: the lag it then misses is below -100 dB.
constexpr std::array kFastParts = {0.25, 0.25, 0.125, 0.125, 0.125, 0.125};
constexpr std::array kSlowParts = {0.5, 0.5};
constexpr double kSlow = 2e-5;  // of the whole dial, a sample

struct WholeStep {
  Eigen::MatrixXd transition;
  Drive<double> drive;  // Chebyshev moments of the sample's interval
  Eigen::RowVectorXd output;
  double direct = 0;
};

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
  WholeStep step;

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

  void process(const double* const* in, double* const* out, int frames, const double* const* dials, int offset) {
    const int latency = interpolator.latency();
    for (std::size_t channel = 0; channel < history.size(); ++channel) {
      history[channel].push(in[channel] + offset, frames);
      interpolator.process(history[channel].newest(), frames, moments[channel].data(), block);
    }
    Dials now(at.size());
    Eigen::Matrix<double, Interpolator::moments, 1> moment;
    for (int n = 0; n < frames; ++n) {
      for (std::size_t k = 0; k < now.size(); ++k) now[k] = dials[k][offset + n];
      if (at_rest) at = now;
      at_rest = false;
      advance(now);
      for (std::size_t channel = 0; channel < history.size(); ++channel) {
        for (int p = 0; p < Interpolator::moments; ++p)
          moment(p) = moments[channel][static_cast<std::size_t>(p * block + n)];
        Eigen::VectorXd& state = states[channel];
        state = (step.transition * state + step.drive * moment).eval();
        const double direct = step.direct * history[channel].newest()[n - latency];
        out[channel][offset + n] = (state.size() == 0 ? 0.0 : step.output.dot(state)) + direct;
      }
    }
    for (History& past : history) past.keep(frames);
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
