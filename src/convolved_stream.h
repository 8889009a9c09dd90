// Streams planar blocks through convolutions, one a channel, and gives back as many frames, lined up.
#pragma once

#include <cstdint>
#include <memory>
#include <vector>

#include "dsp/convolver.h"
#include "src/play_through.h"

namespace unsoldered {

/// One for each channel, all of one latency (see make_plans).
using ChannelPlans = std::vector<std::shared_ptr<const ConvolutionPlan>>;

/// Plans for filters of any lengths, made equally long; `channels` picks the filter of each channel.
ChannelPlans make_plans(std::vector<Fir> filters, const std::vector<std::size_t>& channels);

/// One thread.
class ConvolvedStream {
 public:
  /// `lead`: frames to give before the first, at most as many as the filters begin before time zero.
  explicit ConvolvedStream(const ChannelPlans& plans, int lead = 0);

  /// Gives `sink` what is ready; false when it said stop.
  bool push(const double* const* channels, int frames, const BlockSink& sink);

  /// After the last frame: gives what is left. What rings on beyond the last frame is cut off.
  bool finish(const BlockSink& sink);

 private:
  bool pass(const double* const* channels, int frames, const BlockSink& sink);

  std::vector<Convolver> convolvers_;
  std::vector<std::vector<double>> out_;
  int to_skip_ = 0;
  std::int64_t owed_ = 0;  // frames pushed and not yet given
};

}  // namespace unsoldered
