#include "dsp/fourier.h"

#include <unsupported/Eigen/FFT>

namespace unsoldered {

struct Fourier::State {
  Eigen::FFT<double> transform;
  Spectrum result;
};

Fourier::Fourier(int size) : size_(size), state_(std::make_unique<State>()) {
  state_->transform.SetFlag(Eigen::FFT<double>::Unscaled);
  state_->result.resize(static_cast<std::size_t>(size));
  // The first call of each direction makes the plan.
  Spectrum nothing(static_cast<std::size_t>(size));
  forward(nothing);
  backward(nothing);
}
Fourier::~Fourier() = default;
Fourier::Fourier(Fourier&&) noexcept = default;
Fourier& Fourier::operator=(Fourier&&) noexcept = default;

void Fourier::forward(Spectrum& values) {
  state_->transform.fwd(state_->result.data(), values.data(), size_);
  values.swap(state_->result);
}

void Fourier::backward(Spectrum& values) {
  state_->transform.inv(state_->result.data(), values.data(), size_);
  values.swap(state_->result);
}

}  // namespace unsoldered
