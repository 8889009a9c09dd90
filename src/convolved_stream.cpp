#include "src/convolved_stream.h"

#include <algorithm>
#include <utility>

namespace unsoldered {
namespace {

constexpr int kBlockFrames = 16384;

}  // namespace

ChannelPlans make_plans(std::vector<Fir> filters, const std::vector<std::size_t>& channels) {
  int before = 0;
  std::size_t length = 0;
  for (const Fir& filter : filters) before = std::max(before, filter.before);
  for (Fir& filter : filters) {
    filter.taps.insert(filter.taps.begin(), static_cast<std::size_t>(before - filter.before), 0.0);
    filter.before = before;
    length = std::max(length, filter.taps.size());
  }
  ChannelPlans distinct;
  for (Fir& filter : filters) {
    filter.taps.resize(length, 0.0);
    distinct.push_back(std::make_shared<const ConvolutionPlan>(filter));
  }
  ChannelPlans plans;
  for (const std::size_t channel : channels) plans.push_back(distinct[channel]);
  return plans;
}

ConvolvedStream::ConvolvedStream(const ChannelPlans& plans, int lead)
    : out_(plans.size(), std::vector<double>(kBlockFrames)), owed_(lead) {
  for (const auto& plan : plans) convolvers_.emplace_back(plan);
  to_skip_ = convolvers_.front().latency_frames() - lead;
}

bool ConvolvedStream::push(const double* const* channels, int frames, const BlockSink& sink) {
  owed_ += frames;
  return pass(channels, frames, sink);
}

bool ConvolvedStream::finish(const BlockSink& sink) {
  const std::vector<double> silence(kBlockFrames, 0.0);
  const std::vector<const double*> in(out_.size(), silence.data());
  while (owed_ > 0) {
    if (!pass(in.data(), kBlockFrames, sink)) return false;
  }
  return true;
}

bool ConvolvedStream::pass(const double* const* channels, int frames, const BlockSink& sink) {
  std::vector<const double*> ready(out_.size());
  for (int done = 0; done < frames; done += kBlockFrames) {
    const int count = std::min(kBlockFrames, frames - done);
    const int skipped = std::min(to_skip_, count);
    for (std::size_t channel = 0; channel < out_.size(); ++channel) {
      convolvers_[channel].process(channels[channel] + done, out_[channel].data(), count);
      ready[channel] = out_[channel].data() + skipped;
    }
    to_skip_ -= skipped;
    const auto given = static_cast<int>(std::min<std::int64_t>(count - skipped, owed_));
    owed_ -= given;
    if (given > 0 && !sink(ready.data(), given)) return false;
  }
  return true;
}

}  // namespace unsoldered
