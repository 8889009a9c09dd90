#include "src/play_through.h"

#include <algorithm>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "dsp/error.h"
#include "dsp/hookup_network.h"
#include "dsp/moving_pot_filter.h"
#include "dsp/several_knobs_filter.h"

namespace unsoldered {
namespace {

constexpr int kBlockFrames = 16384;  // large enough to make calls cheap, small enough to stay in the processor's cache

/// One of the three filters, fed with take frames in order.
class Knobbed {
 public:
  Knobbed(const Hookup& hookup, Driven driven, const KnobMotion& motion, int rate_hz, int channels)
      : rate_hz_(rate_hz) {
    Hookup at = hookup;
    if (const auto* dial = std::get_if<double>(&motion)) {
      at.volume.dial = *dial;
      held_.emplace(hookup_circuit(at, driven), rate_hz_, channels);
      return;
    }
    const auto& turning = std::get<std::vector<TurningKnob>>(motion);
    std::vector<Knob> knobs;
    for (const TurningKnob& one : turning) {
      turns_.push_back(&one.turn);
      dials_.emplace_back(kBlockFrames);
      dial_pointers_.push_back(dials_.back().data());
      knobs.push_back(one.knob);
    }
    const Circuit circuit = hookup_circuit(at, driven);
    if (knobs.size() == 1)
      moving_.emplace(circuit, knobs.front(), rate_hz_, channels);
    else
      several_.emplace(circuit, knobs, rate_hz_, channels);
  }

  /// Where in the take the first frame lies; 0 unless said.
  void start_at(std::int64_t frame) noexcept { next_frame_ = frame; }

  int latency_frames() const noexcept {
    return held_ ? held_->latency_frames() : moving_ ? moving_->latency_frames() : several_->latency_frames();
  }

  void process(const double* const* in, double* const* out, int frames) {
    if (held_) return held_->process(in, out, frames);
    for (std::size_t k = 0; k < turns_.size(); ++k)
      turns_[k]->fill(next_frame_ - latency_frames(), rate_hz_, frames, dials_[k].data());
    next_frame_ += frames;
    if (moving_)
      moving_->process(in, out, frames, dials_.front().data());
    else
      several_->process(in, out, frames, dial_pointers_.data());
  }

 private:
  double rate_hz_;
  std::vector<const Turn*> turns_;
  std::int64_t next_frame_ = 0;
  std::vector<std::vector<double>> dials_;
  std::vector<const double*> dial_pointers_;
  std::optional<HeldPotFilter> held_;
  std::optional<MovingPotFilter> moving_;
  std::optional<SeveralKnobsFilter> several_;
};

/// A filter and the channels that go through it.
struct Voice {
  Knobbed filter;
  std::vector<std::size_t> from;  // channels of the take, one after the other
  std::vector<std::vector<double>> out;
  std::vector<std::vector<std::size_t>> to;  // for each of `from`, the channels its output is added to
};

/// All channels of a take through a hookup: both gangs of stereo pots, both sources.
class Channels {
 public:
  Channels(const Hookup& hookup, const KnobMotion& motion, const TakeFormat& format)
      : channels_(static_cast<std::size_t>(format.channels)) {
    if (hookup.second_channel && *hookup.second_channel > format.channels)
      throw InputError("second_channel " + std::to_string(*hookup.second_channel) + ": the take has " +
                       std::to_string(format.channels) + (format.channels == 1 ? " channel" : " channels") +
                       "; give one of its channels, or take second_channel out");
    if (hookup.second_channel) second_ = static_cast<std::size_t>(*hookup.second_channel) - 1;
    const bool gangs = has_right_gang(hookup);
    for (int gang = 0; gang < (gangs ? 2 : 1); ++gang) {
      std::vector<std::size_t> own;
      for (std::size_t channel = 0; channel < channels_; ++channel)
        if ((!gangs || static_cast<int>(channel % 2) == gang) && (channels_ == 1 || channel != second_))
          own.push_back(channel);
      if (own.empty()) continue;
      const Hookup half = gang == 0 ? hookup : right_half(hookup);
      std::vector<std::vector<std::size_t>> each;
      for (const std::size_t channel : own) each.push_back({channel});
      add(half, second_ ? Driven::first : driven_source(half), motion, format, own, each);
      if (second_) add(half, Driven::second, motion, format, {*second_}, {own});
    }
  }

  void start_at(std::int64_t frame) noexcept {
    for (Voice& voice : voices_) voice.filter.start_at(frame);
  }

  int latency_frames() const noexcept { return voices_.front().filter.latency_frames(); }

  /// in and out are different.
  void process(const double* const* in, double* const* out, int frames) {
    for (std::size_t channel = 0; channel < channels_; ++channel) std::fill_n(out[channel], frames, 0.0);
    for (Voice& voice : voices_) {
      std::vector<const double*> from;
      std::vector<double*> to;
      for (const std::size_t channel : voice.from) from.push_back(in[channel]);
      for (std::vector<double>& samples : voice.out) to.push_back(samples.data());
      voice.filter.process(from.data(), to.data(), frames);
      for (std::size_t i = 0; i < voice.from.size(); ++i)
        for (const std::size_t channel : voice.to[i])
          for (int n = 0; n < frames; ++n) out[channel][n] += to[i][n];
    }
    if (second_ && channels_ > 1) std::copy_n(out[*second_ == 0 ? 1 : 0], frames, out[*second_]);
  }

 private:
  void add(const Hookup& hookup, Driven driven, const KnobMotion& motion, const TakeFormat& format,
           std::vector<std::size_t> from, std::vector<std::vector<std::size_t>> to) {
    const int count = static_cast<int>(from.size());
    std::vector<std::vector<double>> out(from.size(), std::vector<double>(kBlockFrames));
    voices_.push_back(
        {Knobbed(hookup, driven, motion, format.rate_hz, count), std::move(from), std::move(out), std::move(to)});
  }

  std::size_t channels_;
  std::optional<std::size_t> second_;
  std::vector<Voice> voices_;
};

Channels make_channels(const Hookup& hookup, const KnobMotion& motion, const TakeFormat& format) {
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
  Channels filter = make_channels(hookup, motion, format);

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

  filter.start_at(-take.lead_frames());
  int to_skip = filter.latency_frames() + take.lead_frames();
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
