// Discrete Fourier transforms of one size, in double, for convolution.
//
// Hand-made because it is twice as fast as Eigen's (kissfft), whose loops the compiler cannot make wide; FFTW is
// not to be had under our licence.
#pragma once

#include <vector>

#include "dsp/kernels.h"

namespace unsoldered {

/// Complex numbers with real and imaginary parts in arrays of their own.
struct Spectrum {
  std::vector<double> re;
  std::vector<double> im;

  Spectrum() = default;
  explicit Spectrum(int size) : re(static_cast<std::size_t>(size), 0), im(static_cast<std::size_t>(size), 0) {}
};

class Fourier {
 public:
  /// Setup thread. `size` is a power of two, at least 16.
  explicit Fourier(int size);

  int size() const noexcept { return size_; }

  /// In place, unscaled: out[k] = sum over n of in[n] exp(-2 pi i k n / size). `work` of the same size. Audio thread.
  void forward(Spectrum& values, Spectrum& work) const noexcept;

  /// The same with the sign of the exponent changed, unscaled. Audio thread.
  void backward(Spectrum& values, Spectrum& work) const noexcept;

 private:
  FourierTables tables() const noexcept;

  int size_;
  std::vector<double> re_;
  std::vector<double> im_;
  std::vector<double> first_;
};

}  // namespace unsoldered
