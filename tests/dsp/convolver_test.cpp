#include "dsp/convolver.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <memory>
#include <numbers>
#include <random>
#include <vector>

#include "dsp/fourier.h"
#include "tests/catch.h"

using unsoldered::ConvolutionPlan;
using unsoldered::Convolver;
using unsoldered::Fir;
using unsoldered::Fourier;
using unsoldered::Spectrum;

namespace {

std::vector<double> noise(int count, unsigned seed) {
  std::mt19937 random(seed);
  std::uniform_real_distribution<double> any(-1, 1);
  std::vector<double> samples(static_cast<std::size_t>(count));
  for (double& sample : samples) sample = any(random);
  return samples;
}

/// What the filter is said to be, sample by sample.
double direct(const std::vector<double>& in, const Fir& fir, int n) {
  double sum = 0;
  for (int k = 0; k < static_cast<int>(fir.taps.size()); ++k) {
    const int at = n + fir.before - k;
    if (at >= 0 && at < static_cast<int>(in.size()))
      sum += fir.taps[static_cast<std::size_t>(k)] * in[static_cast<std::size_t>(at)];
  }
  return sum;
}

}  // namespace

TEST_CASE("Fourier transforms agree with their definition, and go back") {
  for (const int size : {16, 32, 64, 128, 1024, 2048}) {
    Fourier fourier(size);
    const std::vector<double> re = noise(size, 1);
    const std::vector<double> im = noise(size, 2);
    Spectrum given;
    for (std::size_t i = 0; i < re.size(); ++i) given.emplace_back(re[i], im[i]);
    Spectrum values = given;
    fourier.forward(values);
    for (int k = 0; k < size; k += std::max(1, size / 50)) {
      std::complex<double> sum = 0;
      for (int n = 0; n < size; ++n)
        sum += given[static_cast<std::size_t>(n)] *
               std::polar(1.0, -2 * std::numbers::pi * (static_cast<double>(k) * n / size));
      CHECK(std::abs(sum - values[static_cast<std::size_t>(k)]) < 1e-11 * size);
    }
    fourier.backward(values);
    for (std::size_t i = 0; i < given.size(); ++i)
      REQUIRE(std::abs(values[i] / static_cast<double>(size) - given[i]) < 1e-14);
  }
}

TEST_CASE("A convolver's answer is the sum over its taps, as late as it says, whatever the blocks") {
  std::mt19937 random(3);
  // One transform, several parts with an even and an odd number of them, just over a part.
  for (const int taps : {1, 2, 500, 1025, 9000, 16384, 16385, 20000, 41000}) {
    Fir fir;
    fir.taps = noise(taps, 4);
    fir.before = taps / 3;
    const auto plan = std::make_shared<const ConvolutionPlan>(fir);
    Convolver convolver(plan);
    const int latency = convolver.latency_frames();
    const int length = 3 * latency + 70001;
    std::vector<double> in = noise(length, 5);
    std::fill(in.begin() + length / 2, in.end(), 0.0);
    std::vector<double> out = in;  // in place
    for (int round = 0; round < 2; ++round) {
      out = in;
      for (int done = 0; done < length;) {
        const int count = std::min(length - done, static_cast<int>(random() % 9000));
        convolver.process(out.data() + done, out.data() + done, count);
        done += count;
      }
      const double scale = std::sqrt(taps);
      double worst = 0;
      for (int n = 0; n < length - latency; n += 1 + static_cast<int>(random() % 700)) {
        const double due = direct(in, fir, n);
        worst = std::max(worst, std::abs(out[static_cast<std::size_t>(n + latency)] - due) / scale);
      }
      INFO("taps " << taps << ", round " << round);
      CHECK(worst < 1e-13);
      CHECK(*std::max_element(out.begin(), out.begin() + latency - fir.before) == 0);
      convolver.reset();
    }
  }
}
