#include "dsp/moving_pot_filter.h"

#include <algorithm>
#include <vector>

#include "dsp/denormals.h"
#include "dsp/history.h"
#include "dsp/hookup_network.h"
#include "dsp/interpolator.h"
#include "dsp/kernels.h"
#include "dsp/step_table.h"

namespace unsoldered {

struct MovingPotFilter::State {
  static constexpr int block = 128;

  Interpolator interpolator;
  StepTable table;
  std::vector<History> history;  // by channel
  std::vector<double> states;    // channels x padded
  std::vector<double> moments;   // Interpolator::moments x block
  std::vector<double> work;      // for the kernel: a row
  std::vector<double> lowest;    // dial within the sample, one a frame
  std::vector<double> rows;      // of the knob, one a frame
  std::vector<double> speeds;    // one a frame
  std::vector<double> places;    // along the table, one a frame
  double place = 0;              // at the last frame
  double dial = 0;               // at the last frame
  bool at_rest = true;           // nothing played yet: the first dial is where the knob has always been

  State(const Circuit& circuit, const Knob& knob, double rate_hz, int channels)
      : interpolator(rate_hz), table(circuit, knob, rate_hz) {
    const auto count = static_cast<std::size_t>(channels);
    history.assign(count, History(interpolator.taps(), block));
    states.assign(count * static_cast<std::size_t>(table.layout().padded), 0);
    moments.assign(static_cast<std::size_t>(Interpolator::moments) * block, 0);
    work.assign(static_cast<std::size_t>(table.layout().size), 0);
    places.assign(block, 0);
    lowest.assign(block, 0);
    rows.assign(block, 0);
    speeds.assign(block, 0);
  }

  void follow(const double* dials, int frames) noexcept {
    if (at_rest) {
      dial = dials[0];
      place = table.place(dial);
      at_rest = false;
    }
    for (int n = 0; n < frames; ++n) {
      const auto i = static_cast<std::size_t>(n);
      const double before = place;
      if (dials[n] != dial) place = table.place(dials[n]);
      lowest[i] = std::min(dial, dials[n]);  // a no-load pot is open in a sample that it has spent at 10
      dial = dials[n];
      places[i] = place;
      speeds[i] = table.speed(before, place);
    }
    table.rows_at(lowest.data(), places.data(), frames, rows.data());
  }

  void process(const double* in, double* out, int frames, std::size_t channel) noexcept {
    History& past = history[channel];
    past.push(in, frames);
    interpolator.process(past.newest(), frames, moments.data(), block);
    const TurnInput input{table.rows(),
                          table.layout(),
                          rows.data(),
                          speeds.data(),
                          moments.data(),
                          block,
                          past.newest() - interpolator.latency()};
    turn(input, frames, work.data(), states.data() + channel * static_cast<std::size_t>(table.layout().padded), out);
    past.keep(frames);
  }
};

MovingPotFilter::MovingPotFilter(const Circuit& circuit, const Knob& knob, double rate_hz, int channels)
    : state_(std::make_unique<State>(circuit, knob, rate_hz, channels)) {}
MovingPotFilter::MovingPotFilter(const Hookup& hookup, const Knob& knob, double rate_hz, int channels)
    : MovingPotFilter(hookup_circuit(hookup), knob, rate_hz, channels) {}
MovingPotFilter::~MovingPotFilter() = default;
MovingPotFilter::MovingPotFilter(MovingPotFilter&&) noexcept = default;
MovingPotFilter& MovingPotFilter::operator=(MovingPotFilter&&) noexcept = default;

int MovingPotFilter::latency_frames() const noexcept { return state_->interpolator.latency(); }

void MovingPotFilter::process(const double* const* in, double* const* out, int frames, const double* dials) noexcept {
  const DenormalsOff guard;
  for (int done = 0; done < frames; done += State::block) {
    const int count = std::min(State::block, frames - done);
    state_->follow(dials + done, count);
    for (std::size_t channel = 0; channel < state_->history.size(); ++channel)
      state_->process(in[channel] + done, out[channel] + done, count, channel);
  }
}

void MovingPotFilter::reset() noexcept {
  for (History& past : state_->history) past.clear();
  std::fill(state_->states.begin(), state_->states.end(), 0.0);
  state_->at_rest = true;
}

double MovingPotFilter::stored_energy_j(int channel) const noexcept {
  const auto padded = static_cast<std::size_t>(state_->table.layout().padded);
  const double* state = state_->states.data() + static_cast<std::size_t>(channel) * padded;
  double energy = 0;
  for (std::size_t i = 0; i < padded; ++i) energy += state[i] * state[i] / 2;
  return energy;
}

}  // namespace unsoldered
