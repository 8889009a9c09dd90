#include "dsp/decay.h"

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <algorithm>
#include <cmath>
#include <complex>

#include "dsp/kernels.h"

namespace unsoldered {
namespace {

using LongComplex = std::complex<Long>;
using LongComplexVector = Eigen::Matrix<LongComplex, Eigen::Dynamic, 1>;

constexpr Long inaudible = 1e-9L;  // -180 dB of full scale for everything a mode will ever add
constexpr Long modes_must_agree = 1e-10L;
constexpr int compared_samples = 200;

}  // namespace

Decay::Decay(const LongMatrix& step, const LongVector& entry, const LongRow& exit) {
  if (step.rows() > 0 && !set_modes(step, entry, exit)) set_coupled(step, entry, exit);
}

bool Decay::set_modes(const LongMatrix& step, const LongVector& entry, const LongRow& exit) {
  const Eigen::EigenSolver<LongMatrix> solver(step);
  if (solver.info() != Eigen::Success) return false;
  const auto vectors = solver.eigenvectors().eval();
  const LongComplexVector poles = solver.eigenvalues();
  const LongComplexVector into = vectors.partialPivLu().solve(entry.cast<LongComplex>());
  LongComplexVector residues = (exit.cast<LongComplex>() * vectors).transpose();
  residues = residues.cwiseProduct(into).eval();

  // The modes are believed only where they add up to the decay itself.
  LongVector state = entry;
  LongComplexVector ringing = residues;
  const Long scale = inaudible + residues.cwiseAbs().maxCoeff();
  for (int n = 0; n < compared_samples; ++n) {
    if (!(std::abs(ringing.sum().real() - (exit * state).value()) < modes_must_agree * (1 + scale))) return false;
    state = (step * state).eval();
    ringing = ringing.cwiseProduct(poles).eval();
  }
  for (Eigen::Index i = 0; i < poles.size(); ++i) {
    if (poles(i).imag() < 0) continue;  // its conjugate stands for both
    const Long twice = poles(i).imag() > 0 ? 2 : 1;
    const Long remaining = std::abs(residues(i)) * twice;
    if (remaining < inaudible * std::max(Long(1e-6), 1 - std::abs(poles(i)))) continue;
    pole_re_.push_back(static_cast<double>(poles(i).real()));
    pole_im_.push_back(static_cast<double>(poles(i).imag()));
    residue_re_.push_back(static_cast<double>(residues(i).real() * twice));
    residue_im_.push_back(static_cast<double>(residues(i).imag() * twice));
  }
  const std::size_t padded = (pole_re_.size() + 3) / 4 * 4;
  for (std::vector<double>* list : {&pole_re_, &pole_im_, &residue_re_, &residue_im_}) list->resize(padded, 0);
  return true;
}

void Decay::set_coupled(const LongMatrix& step, const LongVector& entry, const LongRow& exit) {
  const Eigen::RealSchur<LongMatrix> schur(step);
  step_ = schur.matrixT().cast<double>();
  entry_ = (schur.matrixU().transpose() * entry).cast<double>();
  exit_ = (exit * schur.matrixU()).cast<double>();
}

Decay::Memory Decay::memory() const {
  Memory memory;
  memory.re.assign(pole_re_.size(), 0);
  memory.im.assign(pole_re_.size(), 0);
  memory.state = Eigen::VectorXd::Zero(step_.rows());
  memory.next = memory.state;
  return memory;
}

void Decay::clear(Memory& memory) noexcept {
  std::fill(memory.re.begin(), memory.re.end(), 0.0);
  std::fill(memory.im.begin(), memory.im.end(), 0.0);
  memory.state.setZero();
}

void Decay::process(const double* input, int frames, Memory& memory, double* out) const noexcept {
  const Modes modes{pole_re_.data(), pole_im_.data(), residue_re_.data(), residue_im_.data(),
                    static_cast<int>(pole_re_.size())};
  ring(modes, input, frames, memory.re.data(), memory.im.data(), out);
  const Eigen::Index size = step_.rows();
  if (size == 0) return;
  for (int n = 0; n < frames; ++n) {
    double value = 0;
    for (Eigen::Index i = 0; i < size; ++i) {
      value += exit_(i) * memory.state(i);
      double sum = entry_(i) * input[n];
      for (Eigen::Index j = i > 0 ? i - 1 : 0; j < size; ++j) sum += step_(i, j) * memory.state(j);
      memory.next(i) = sum;
    }
    out[n] += value;
    memory.state.swap(memory.next);
  }
}

}  // namespace unsoldered
