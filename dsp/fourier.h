// Discrete Fourier transforms of one size, in double: Eigen's, which carries kissfft.
#pragma once

#include <complex>
#include <memory>
#include <vector>

namespace unsoldered {

using Spectrum = std::vector<std::complex<double>>;

class Fourier {
 public:
  /// Setup thread. `size` is a power of two, at least 16.
  explicit Fourier(int size);
  ~Fourier();
  Fourier(Fourier&&) noexcept;
  Fourier& operator=(Fourier&&) noexcept;

  int size() const noexcept { return size_; }

  /// In place, unscaled: out[k] = sum over n of in[n] exp(-2 pi i k n / size). Not for sharing between threads (holds work
  /// space); no allocation.
  void forward(Spectrum& values);

  /// The same with exp(+2 pi i k n / size).
  void backward(Spectrum& values);

 private:
  struct State;
  int size_;
  std::unique_ptr<State> state_;
};

}  // namespace unsoldered
