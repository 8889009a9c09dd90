#include "src/play_through.h"

#include <algorithm>
#include <optional>
#include <vector>

#include "dsp/moving_pot_filter.h"

namespace unsoldered {
namespace {

constexpr int kBlockFrames = 16384;  // large enough to make calls cheap, small enough to stay in the processor's cache

/// Either filter, fed with take frames in order.
class Knobbed {
 public:
  Knobbed(const Hookup& hookup, const KnobMotion& motion, const TakeFormat& format) : rate_hz_(format.rate_hz) {
    if (const auto* turning = std::get_if<TurningKnob>(&motion)) {
      turn_ = &turning->turn;
      dials_.resize(kBlockFrames);
      moving_.emplace(hookup, turning->knob, rate_hz_, format.channels);
    } else {
      held_.emplace(hookup, std::get<double>(motion), rate_hz_, format.channels);
    }
  }

  int latency_frames() const noexcept { return held_ ? held_->latency_frames() : moving_->latency_frames(); }

  void process(const double* const* in, double* const* out, int frames) noexcept {
    if (held_) {
      held_->process(in, out, frames);
    } else {
      turn_->fill(next_frame_ - latency_frames(), rate_hz_, frames, dials_.data());
      moving_->process(in, out, frames, dials_.data());
      next_frame_ += frames;
    }
  }

 private:
  double rate_hz_;
  const Turn* turn_ = nullptr;
  std::int64_t next_frame_ = 0;
  std::vector<double> dials_;
  std::optional<HeldPotFilter> held_;
  std::optional<MovingPotFilter> moving_;
};

/// A network without a solution is the hookup's fault, not the take's: the caller may want to say whose.
Knobbed make_filter(const Hookup& hookup, const KnobMotion& motion, const TakeFormat& format) {
  try {
    return {hookup, motion, format};
  } catch (const HookupError&) {
    throw;
  } catch (const InputError& error) {
    throw HookupError("", error.what());
  }
}

}  // namespace

std::int64_t play_through(Take& take, const Hookup& hookup, const KnobMotion& motion, const BlockSink& sink) {
  const TakeFormat format = take.format();
  const auto channels = static_cast<std::size_t>(format.channels);
  Knobbed filter = make_filter(hookup, motion, format);

  std::vector<double> interleaved(channels > 1 ? channels * kBlockFrames : 0);
  std::vector<std::vector<double>> in(channels, std::vector<double>(kBlockFrames));
  std::vector<std::vector<double>> out = in;
  std::vector<double*> in_pointers;
  std::vector<double*> out_pointers;
  for (std::size_t channel = 0; channel < channels; ++channel) {
    in_pointers.push_back(in[channel].data());
    out_pointers.push_back(out[channel].data());
  }

  const auto read = [&] {
    if (channels == 1) return take.read(in[0].data(), kBlockFrames);
    const int frames = take.read(interleaved.data(), kBlockFrames);
    for (std::size_t channel = 0; channel < channels; ++channel) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(frames); ++i) {
        in[channel][i] = interleaved[i * channels + channel];
      }
    }
    return frames;
  };

  int to_skip = filter.latency_frames();
  std::int64_t given = 0;
  std::vector<const double*> kept(channels);
  const auto pass_on = [&](int frames) {
    filter.process(in_pointers.data(), out_pointers.data(), frames);
    const int skipped = std::min(to_skip, frames);
    to_skip -= skipped;
    if (skipped == frames) return true;
    for (std::size_t channel = 0; channel < channels; ++channel) kept[channel] = out_pointers[channel] + skipped;
    given += frames - skipped;
    return sink(kept.data(), frames - skipped);
  };

  while (const int frames = read()) {
    if (!pass_on(frames)) return given;
  }
  for (auto& channel : in) std::fill(channel.begin(), channel.end(), 0.0);
  for (int left = filter.latency_frames(); left > 0; left -= kBlockFrames) {
    if (!pass_on(std::min(left, kBlockFrames))) return given;
  }
  return given;
}

}  // namespace unsoldered
