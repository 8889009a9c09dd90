// A held circuit is a fixed linear filter: the part of its impulse response that the interpolator shapes is a short
// convolution, what follows is the circuit's own decay, run as a recursion on the state left at that point.

#include <algorithm>
#include <vector>

#include "dsp/decay.h"
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
  std::vector<double> response;  // the first taps() samples of the impulse response
  Decay decay;                   // the rest of it
  std::vector<History> history;  // by channel
  std::vector<Decay::Memory> memory;

  State(const Circuit& circuit, double rate_hz, int channels) : interpolator(rate_hz) {
    const StateSpace space = StateSpaceFamily(circuit).at();
    const Step<Long> step = exact_step(space, 1 / static_cast<Long>(rate_hz));
    const LongMatrix& whole = step.transition;
    const Drive<Long> drive = step.drive * chebyshev_powers<Long>(0, 1);
    const int taps = interpolator.taps();
    LongVector state = LongVector::Zero(space.a.rows());
    response.resize(static_cast<std::size_t>(taps));
    for (int m = 0; m < taps; ++m) {
      state = (whole * state).eval();
      for (int p = 0; p < Interpolator::moments; ++p) state += drive.col(p) * interpolator.weight(p, taps - 1 - m);
      const Long direct = m == interpolator.latency() ? space.d : 0;
      response[static_cast<std::size_t>(m)] = static_cast<double>((space.c * state).value() + direct);
    }
    decay = Decay(whole, state, space.c * whole);
    history.assign(static_cast<std::size_t>(channels), History(taps, block));
    memory.assign(static_cast<std::size_t>(channels), decay.memory());
  }

  void process(const double* in, double* out, int frames, std::size_t channel) noexcept {
    History& past = history[channel];
    past.push(in, frames);
    convolve(past.newest(), frames, response.data(), interpolator.taps(), out);
    decay.process(past.newest() - interpolator.taps() + 1, frames, memory[channel], out);
    past.keep(frames);
  }
};

HeldPotFilter::HeldPotFilter(const Circuit& circuit, double rate_hz, int channels)
    : state_(std::make_unique<State>(circuit, rate_hz, channels)) {}
HeldPotFilter::HeldPotFilter(const Hookup& hookup, double dial, double rate_hz, int channels)
    : HeldPotFilter(hookup_circuit(hookup, dial), rate_hz, channels) {}
HeldPotFilter::~HeldPotFilter() = default;
HeldPotFilter::HeldPotFilter(HeldPotFilter&&) noexcept = default;
HeldPotFilter& HeldPotFilter::operator=(HeldPotFilter&&) noexcept = default;

int HeldPotFilter::latency_frames() const noexcept { return state_->interpolator.latency(); }

void HeldPotFilter::process(const double* const* in, double* const* out, int frames) noexcept {
  const DenormalsOff guard;
  for (std::size_t channel = 0; channel < state_->history.size(); ++channel)
    for (int done = 0; done < frames; done += State::block)
      state_->process(in[channel] + done, out[channel] + done, std::min(State::block, frames - done), channel);
}

void HeldPotFilter::reset() noexcept {
  for (History& past : state_->history) past.clear();
  for (Decay::Memory& one : state_->memory) Decay::clear(one);
}

}  // namespace unsoldered
