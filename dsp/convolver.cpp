#include "dsp/convolver.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <utility>

#include "dsp/denormals.h"
#include "dsp/kernels.h"

namespace unsoldered {
namespace {

constexpr int kSmallest = 2048;
constexpr int kLargestWhole = 32768;  // larger transforms leave the processor's cache
constexpr int kLargestPart = 262144;

/// Size of the transform that costs least a frame, the response in one piece; the least for very long ones too.
int whole_size(int taps) {
  int best = kSmallest;
  double least = 0;
  for (int size = kSmallest; size <= kLargestWhole; size *= 2) {
    if (size < 2 * taps) continue;
    const double cost = size * std::log2(size) / (size - taps + 1);
    if (least == 0 || cost < least) {
      best = size;
      least = cost;
    }
  }
  return least == 0 ? 0 : best;
}

int transform_size(int taps) {
  if (const int whole = whole_size(taps)) return whole;
  const auto quarter = static_cast<int>(std::bit_ceil(static_cast<unsigned>(taps) / 4));
  return 2 * std::min(quarter, kLargestPart / 2);
}

int hop_frames(int taps) { return whole_size(taps) != 0 ? transform_size(taps) - taps + 1 : transform_size(taps) / 2; }

}  // namespace

ConvolutionPlan::ConvolutionPlan(const Fir& fir)
    : before_(fir.before),
      hop_(hop_frames(static_cast<int>(fir.taps.size()))),
      fourier_(transform_size(static_cast<int>(fir.taps.size()))) {
  const int size = fourier_.size();
  const std::size_t each = fourier_.size() == 2 * hop_ ? static_cast<std::size_t>(hop_) : fir.taps.size();
  Spectrum work(size);
  for (std::size_t first = 0; first < fir.taps.size(); first += each) {
    Spectrum part(size);
    const std::size_t count = std::min(each, fir.taps.size() - first);
    for (std::size_t i = 0; i < count; ++i) part.re[i] = fir.taps[first + i] / size;  // the transforms do not scale
    fourier_.forward(part, work);
    parts_.push_back(std::move(part));
  }
}

Convolver::Convolver(std::shared_ptr<const ConvolutionPlan> plan)
    : plan_(std::move(plan)),
      input_(static_cast<std::size_t>(plan_->fourier_.size() + 2 * plan_->hop_), 0),
      output_(static_cast<std::size_t>(2 * plan_->hop_), 0),
      past_(plan_->parts_.size() == 1 ? 1 : std::max<std::size_t>(plan_->parts_.size(), 3),
            Spectrum(plan_->fourier_.size())),
      sum_(plan_->fourier_.size()),
      work_(plan_->fourier_.size()) {}

int Convolver::latency_frames() const noexcept { return 2 * plan_->hop_ + plan_->before_; }

void Convolver::load(Spectrum& spectrum) noexcept {
  const auto count = static_cast<std::size_t>(plan_->fourier_.size());
  std::copy_n(input_.data() + plan_->hop_, count, spectrum.re.data());
  std::copy_n(input_.data() + 2 * plan_->hop_, count, spectrum.im.data());
  plan_->fourier_.forward(spectrum, work_);
}

void Convolver::transform() noexcept {
  // Two hops have come, k and k + 1. A spectrum holds one hop (with what came before it) as real and the next as imaginary
  // numbers; for each part the one that began that many hops ago is due, so with several parts none may be left out.
  const int hop = plan_->hop_;
  const int size = plan_->fourier_.size();
  const auto count = plan_->parts_.size();
  const auto begun_before = [&](std::size_t hops) -> Spectrum& {
    return past_[(newest_ + past_.size() - hops) % past_.size()];
  };
  newest_ = (newest_ + 2) % past_.size();
  const Spectrum& newest = begun_before(0);
  load(begun_before(0));
  if (count > 1) {
    // The one between is put together from its neighbours, which costs less than a transform.
    const Spectrum& older = begun_before(2);
    Spectrum& between = begun_before(1);
    between_hops(older.re.data(), older.im.data(), newest.re.data(), newest.im.data(), size, between.re.data(),
                 between.im.data());
  }
  std::fill(sum_.re.begin(), sum_.re.end(), 0.0);
  std::fill(sum_.im.begin(), sum_.im.end(), 0.0);
  for (std::size_t i = 0; i < count; ++i) {
    const Spectrum& input = begun_before(i);
    const Spectrum& part = plan_->parts_[i];
    multiply_add(input.re.data(), input.im.data(), part.re.data(), part.im.data(), size, sum_.re.data(),
                 sum_.im.data());
  }
  plan_->fourier_.backward(sum_, work_);
  std::copy_n(sum_.re.data() + size - hop, hop, output_.data());
  std::copy_n(sum_.im.data() + size - hop, hop, output_.data() + hop);
  std::copy(input_.begin() + 2 * hop, input_.end(), input_.begin());
}

void Convolver::process(const double* in, double* out, int frames) noexcept {
  const DenormalsOff guard;
  const int whole = 2 * plan_->hop_;
  for (int done = 0; done < frames;) {
    const int count = std::min(frames - done, whole - filled_);
    std::copy_n(in + done, count, input_.data() + plan_->fourier_.size() + filled_);
    std::copy_n(output_.data() + filled_, count, out + done);
    done += count;
    filled_ += count;
    if (filled_ < whole) break;
    transform();
    filled_ = 0;
  }
}

void Convolver::reset() noexcept {
  std::fill(input_.begin(), input_.end(), 0.0);
  std::fill(output_.begin(), output_.end(), 0.0);
  for (Spectrum& one : past_) {
    std::fill(one.re.begin(), one.re.end(), 0.0);
    std::fill(one.im.begin(), one.im.end(), 0.0);
  }
  filled_ = 0;
}

}  // namespace unsoldered
