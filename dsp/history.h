// The last samples of one channel, contiguous with the block at hand.
#pragma once

#include <algorithm>
#include <vector>

namespace unsoldered {

class History {
 public:
  /// Setup thread. `past` samples stay readable before each block of at most `block`.
  History(int past, int block)
      : past_(static_cast<std::size_t>(past)), samples_(static_cast<std::size_t>(past + block), 0) {}

  /// Puts a block of `frames` after the past. Audio thread, as all below.
  void push(const double* input, int frames) noexcept { std::copy_n(input, frames, samples_.data() + past_); }

  /// The block pushed last; newest()[-past..-1] is what came before it.
  const double* newest() const noexcept { return samples_.data() + past_; }

  /// Makes the block of `frames` part of the past.
  void keep(int frames) noexcept {
    std::copy(samples_.data() + frames, samples_.data() + frames + past_, samples_.data());
  }

  void clear() noexcept { std::fill(samples_.begin(), samples_.end(), 0.0); }

 private:
  std::size_t past_;
  std::vector<double> samples_;
};

}  // namespace unsoldered
