#include "dsp/fourier.h"

#include <cmath>
#include <numbers>

namespace unsoldered {

Fourier::Fourier(int size) : size_(size) {
  const auto count = static_cast<std::size_t>(size);
  re_.resize(count);
  im_.resize(count);
  for (std::size_t k = 0; k < count; ++k) {
    const double angle = -2 * std::numbers::pi * static_cast<double>(k) / static_cast<double>(size);
    re_[k] = std::cos(angle);
    im_[k] = std::sin(angle);
  }
  for (std::size_t steps = 1; steps <= 3; ++steps) {
    for (const auto* part : {&re_, &im_}) {
      for (std::size_t p = 0; p < count / 4; ++p) first_.push_back((*part)[steps * p]);
    }
  }
}

FourierTables Fourier::tables() const noexcept { return {size_, re_.data(), im_.data(), first_.data()}; }

void Fourier::forward(Spectrum& values, Spectrum& work) const noexcept {
  if (fourier(tables(), values.re.data(), values.im.data(), work.re.data(), work.im.data())) {
    values.re.swap(work.re);
    values.im.swap(work.im);
  }
}

void Fourier::backward(Spectrum& values, Spectrum& work) const noexcept {
  if (fourier(tables(), values.im.data(), values.re.data(), work.im.data(), work.re.data())) {
    values.re.swap(work.re);
    values.im.swap(work.im);
  }
}

}  // namespace unsoldered
