#include "dsp/moving_pot_filter.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "dsp/denormals.h"
#include "dsp/history.h"
#include "dsp/kernels.h"
#include "dsp/step_table.h"

namespace unsoldered {

struct MovingPotFilter::State {
  static constexpr int block = 128;

  Interpolator interpolator;
  StepTable table;
  int channels;
  std::vector<History> history;       // by channel
  std::vector<double> states;         // channels x padded
  std::vector<double> middle;         // padded
  std::vector<double> moments;        // Interpolator::moments x block
  std::vector<double> rows;           // 2 x row: at the start and the end of a sample
  std::vector<double> frame_moments;  // channels x moments x block
  double* row_before = nullptr;
  double* row_now = nullptr;
  double dial = -1;  // none yet
  bool same_row = false;

  State(const Hookup& hookup, Knob knob, double rate_hz, int channel_count)
      : interpolator(rate_hz), table(hookup, knob, rate_hz), channels(channel_count) {
    const auto padded = static_cast<std::size_t>(table.layout().padded);
    const auto count = static_cast<std::size_t>(channels);
    history.assign(count, History(interpolator.taps(), block));
    states.assign(count * padded, 0);
    middle.assign(padded, 0);
    moments.assign(count * Interpolator::moments * block, 0);
    rows.assign(2 * static_cast<std::size_t>(table.layout().size), 0);
    row_before = rows.data();
    row_now = rows.data() + table.layout().size;
  }

  void turn_to(double new_dial) noexcept {
    if (new_dial == dial) {
      if (!same_row) std::copy_n(row_now, table.layout().size, row_before);
      same_row = true;
      return;
    }
    std::swap(row_before, row_now);
    table.row_at(table.position(new_dial), row_now);
    if (dial < 0) std::copy_n(row_now, table.layout().size, row_before);
    same_row = dial < 0;
    dial = new_dial;
  }

  void process(const double* const* in, double* const* out, int offset, int frames, const double* dials) noexcept {
    const RowLayout& layout = table.layout();
    for (int channel = 0; channel < channels; ++channel) {
      History& past = history[static_cast<std::size_t>(channel)];
      past.push(in[channel] + offset, frames);
      interpolator.process(past.newest(), frames, channel_moments(channel), block);
    }
    for (int n = 0; n < frames; ++n) {
      turn_to(dials[n]);
      for (int channel = 0; channel < channels; ++channel) {
        double* state = states.data() + channel * layout.padded;
        const double* moment = channel_moments(channel) + n;
        half_step(row_before + layout.transition, row_before + layout.first_drive, layout.states, layout.padded, state,
                  moment, Interpolator::moments, block, middle.data());
        half_step(row_now + layout.transition, row_now + layout.second_drive, layout.states, layout.padded,
                  middle.data(), moment, Interpolator::moments, block, state);
        double value = row_now[layout.direct] *
                       history[static_cast<std::size_t>(channel)].newest()[n - interpolator.latency()];
        for (int i = 0; i < layout.states; ++i) value += row_now[layout.output + i] * state[i];
        out[channel][offset + n] = value;
      }
    }
    for (History& past : history) past.keep(frames);
  }

  double* channel_moments(int channel) noexcept { return moments.data() + channel * Interpolator::moments * block; }
};

MovingPotFilter::MovingPotFilter(const Hookup& hookup, Knob knob, double rate_hz, int channels)
    : state_(std::make_unique<State>(hookup, knob, rate_hz, channels)) {}
MovingPotFilter::~MovingPotFilter() = default;
MovingPotFilter::MovingPotFilter(MovingPotFilter&&) noexcept = default;
MovingPotFilter& MovingPotFilter::operator=(MovingPotFilter&&) noexcept = default;

int MovingPotFilter::latency_frames() const noexcept { return state_->interpolator.latency(); }

void MovingPotFilter::process(const double* const* in, double* const* out, int frames, const double* dials) noexcept {
  const DenormalsOff guard;
  for (int done = 0; done < frames; done += State::block)
    state_->process(in, out, done, std::min(State::block, frames - done), dials + done);
}

void MovingPotFilter::reset() noexcept {
  for (History& past : state_->history) past.clear();
  std::fill(state_->states.begin(), state_->states.end(), 0.0);
  state_->dial = -1;
  state_->same_row = false;
}

double MovingPotFilter::stored_energy_j(int channel) const noexcept {
  const int padded = state_->table.layout().padded;
  double energy = 0;
  for (int i = 0; i < padded; ++i) {
    const double state = state_->states[static_cast<std::size_t>(channel * padded + i)];
    energy += state * state / 2;
  }
  return energy;
}

}  // namespace unsoldered
