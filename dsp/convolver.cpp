#include "dsp/convolver.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <complex>
#include <utility>

#include "dsp/denormals.h"

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

/// Of spectra A + iB (older) and C + iD (newer) of real signals A to D: B + iC.
void between_hops(const Spectrum& older, const Spectrum& newer, Spectrum& between) {
  const std::size_t size = older.size();
  constexpr std::complex<double> i(0, 1);
  for (std::size_t k = 0; k < size; ++k) {
    const std::size_t mirrored = (size - k) % size;
    const std::complex<double> b = -0.5 * i * (older[k] - std::conj(older[mirrored]));
    const std::complex<double> c = 0.5 * (newer[k] + std::conj(newer[mirrored]));
    between[k] = b + i * c;
  }
}

void multiply_add(const Spectrum& a, const Spectrum& b, Spectrum& sum) {
  // Written out, because std::complex looks for infinities at each product.
  for (std::size_t k = 0; k < sum.size(); ++k)
    sum[k] += std::complex(a[k].real() * b[k].real() - a[k].imag() * b[k].imag(),
                           a[k].real() * b[k].imag() + a[k].imag() * b[k].real());
}

}  // namespace

ConvolutionPlan::ConvolutionPlan(const Fir& fir)
    : before_(fir.before),
      hop_(hop_frames(static_cast<int>(fir.taps.size()))),
      size_(transform_size(static_cast<int>(fir.taps.size()))) {
  Fourier fourier(size_);
  const std::size_t each = size_ == 2 * hop_ ? static_cast<std::size_t>(hop_) : fir.taps.size();
  for (std::size_t first = 0; first < fir.taps.size(); first += each) {
    Spectrum part(static_cast<std::size_t>(size_));
    const std::size_t count = std::min(each, fir.taps.size() - first);
    for (std::size_t i = 0; i < count; ++i) part[i] = fir.taps[first + i] / size_;  // the transforms do not scale
    fourier.forward(part);
    parts_.push_back(std::move(part));
  }
}

Convolver::Convolver(std::shared_ptr<const ConvolutionPlan> plan)
    : plan_(std::move(plan)),
      fourier_(plan_->size_),
      input_(static_cast<std::size_t>(plan_->size_ + 2 * plan_->hop_), 0),
      output_(static_cast<std::size_t>(2 * plan_->hop_), 0),
      past_(plan_->parts_.size() == 1 ? 1 : std::max<std::size_t>(plan_->parts_.size(), 3),
            Spectrum(static_cast<std::size_t>(plan_->size_))),
      sum_(static_cast<std::size_t>(plan_->size_)) {}

int Convolver::latency_frames() const noexcept { return 2 * plan_->hop_ + plan_->before_; }

void Convolver::load(Spectrum& spectrum) {
  const double* first = input_.data() + plan_->hop_;
  const double* second = input_.data() + 2 * plan_->hop_;
  for (std::size_t i = 0; i < spectrum.size(); ++i) spectrum[i] = {first[i], second[i]};
  fourier_.forward(spectrum);
}

void Convolver::transform() {
  // Two hops have come, k and k + 1. A spectrum holds one hop (with what came before it) as real and the next as imaginary
  // numbers; for each part the one that began that many hops ago is due, so with several parts none may be left out.
  const auto hop = static_cast<std::size_t>(plan_->hop_);
  const auto count = plan_->parts_.size();
  const auto begun_before = [&](std::size_t hops) -> Spectrum& {
    return past_[(newest_ + past_.size() - hops) % past_.size()];
  };
  newest_ = (newest_ + 2) % past_.size();
  load(begun_before(0));
  if (count > 1) {
    // The one between is put together from its neighbours, which costs less than a transform.
    between_hops(begun_before(2), begun_before(0), begun_before(1));
  }
  std::fill(sum_.begin(), sum_.end(), 0.0);
  for (std::size_t i = 0; i < count; ++i) multiply_add(begun_before(i), plan_->parts_[i], sum_);
  fourier_.backward(sum_);
  const std::size_t valid = sum_.size() - hop;
  for (std::size_t i = 0; i < hop; ++i) {
    output_[i] = sum_[valid + i].real();
    output_[hop + i] = sum_[valid + i].imag();
  }
  std::copy(input_.begin() + 2 * plan_->hop_, input_.end(), input_.begin());
}

void Convolver::process(const double* in, double* out, int frames) {
  const DenormalsOff guard;
  const int whole = 2 * plan_->hop_;
  for (int done = 0; done < frames;) {
    const int count = std::min(frames - done, whole - filled_);
    std::copy_n(in + done, count, input_.data() + plan_->size_ + filled_);
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
  for (Spectrum& one : past_) std::fill(one.begin(), one.end(), 0.0);
  filled_ = 0;
}

}  // namespace unsoldered
