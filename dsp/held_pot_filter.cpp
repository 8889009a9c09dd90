// A held circuit is a fixed linear filter: the part of its impulse response that the interpolator shapes is a short
// convolution, what follows is the circuit's own decay, run as a recursion on the state left at that point.

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>
#include <vector>

#include "dsp/denormals.h"
#include "dsp/exact_step.h"
#include "dsp/history.h"
#include "dsp/hookup_network.h"
#include "dsp/interpolator.h"
#include "dsp/kernels.h"
#include "dsp/moving_pot_filter.h"

namespace unsoldered {

struct HeldPotFilter::State {
  static constexpr int block = 512;

  Interpolator interpolator;
  int channels;
  std::vector<double> response;  // the first taps() samples of the impulse response
  Eigen::MatrixXd step;          // quasi-triangular (real Schur form)
  Eigen::VectorXd entry;         // state that an impulse leaves once the convolution has passed it
  Eigen::RowVectorXd exit;
  std::vector<History> history;
  std::vector<Eigen::VectorXd> decay;  // by channel
  Eigen::VectorXd next;

  State(const Hookup& hookup, double dial, double rate_hz, int channel_count)
      : interpolator(rate_hz), channels(channel_count) {
    const StateSpace space = StateSpaceFamily(hookup_network(hookup, dial)).at(0);
    const HalfSteps halves = half_steps(space, rate_hz);
    const LongMatrix whole = halves.transition * halves.transition;
    const LongMatrix drive = halves.transition * halves.first_drive + halves.second_drive;
    const int taps = interpolator.taps();
    LongVector state = LongVector::Zero(space.a.rows());
    response.resize(static_cast<std::size_t>(taps));
    for (int m = 0; m < taps; ++m) {
      state = (whole * state).eval();
      for (int p = 0; p < Interpolator::moments; ++p) state += drive.col(p) * interpolator.weight(p, taps - 1 - m);
      const Long direct = m == interpolator.latency() ? space.d : 0;
      response[static_cast<std::size_t>(m)] = static_cast<double>((space.c * state).value() + direct);
    }
    if (space.a.rows() > 0) set_decay(whole, state, space.c * whole);
    history.assign(static_cast<std::size_t>(channels), History(taps, block));
    decay.assign(static_cast<std::size_t>(channels), Eigen::VectorXd::Zero(step.rows()));
    next = Eigen::VectorXd::Zero(step.rows());
  }

  void set_decay(const LongMatrix& whole, const LongVector& state, const LongRow& output) {
    const Eigen::RealSchur<LongMatrix> schur(whole);
    step = schur.matrixT().cast<double>();
    entry = (schur.matrixU().transpose() * state).cast<double>();
    exit = (output * schur.matrixU()).cast<double>();
  }

  void process(const double* in, double* out, int frames, std::size_t channel) noexcept {
    History& past = history[channel];
    past.push(in, frames);
    convolve(past.newest(), frames, response.data(), interpolator.taps(), out);
    Eigen::VectorXd& state = decay[channel];
    const Eigen::Index size = state.size();
    const double* leaving = past.newest() - interpolator.taps();
    if (size > 0) {
      for (int n = 0; n < frames; ++n) {
        double value = 0;
        for (Eigen::Index i = 0; i < size; ++i) {
          value += exit(i) * state(i);
          double sum = entry(i) * leaving[n + 1];
          for (Eigen::Index j = i > 0 ? i - 1 : 0; j < size; ++j) sum += step(i, j) * state(j);
          next(i) = sum;
        }
        out[n] += value;
        state.swap(next);
      }
    }
    past.keep(frames);
  }
};

HeldPotFilter::HeldPotFilter(const Hookup& hookup, double dial, double rate_hz, int channels)
    : state_(std::make_unique<State>(hookup, dial, rate_hz, channels)) {}
HeldPotFilter::~HeldPotFilter() = default;
HeldPotFilter::HeldPotFilter(HeldPotFilter&&) noexcept = default;
HeldPotFilter& HeldPotFilter::operator=(HeldPotFilter&&) noexcept = default;

int HeldPotFilter::latency_frames() const noexcept { return state_->interpolator.latency(); }

void HeldPotFilter::process(const double* const* in, double* const* out, int frames) noexcept {
  const DenormalsOff guard;
  for (int channel = 0; channel < state_->channels; ++channel)
    for (int done = 0; done < frames; done += State::block)
      state_->process(in[channel] + done, out[channel] + done, std::min(State::block, frames - done),
                      static_cast<std::size_t>(channel));
}

void HeldPotFilter::reset() noexcept {
  for (History& past : state_->history) past.clear();
  for (Eigen::VectorXd& state : state_->decay) state.setZero();
}

}  // namespace unsoldered
