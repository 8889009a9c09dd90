// The free decay of a linear circuit, sample by sample, in the cheapest form that is exact enough.
//
// Normally as independent modes, each a complex one-pole filter; modes that no longer sound are left out. Where two modes
// nearly coincide (critical damping) that form loses digits, and the recursion keeps the coupled (Schur) form instead.
#pragma once

#include <Eigen/Core>
#include <vector>

#include "dsp/state_space.h"

namespace unsoldered {

class Decay {
 public:
  Decay() = default;

  /// Of q[n+1] = step q[n] + entry u[n], y[n] = exit q[n]. Setup thread.
  Decay(const LongMatrix& step, const LongVector& entry, const LongRow& exit);

  /// What one channel remembers.
  struct Memory {
    std::vector<double> re;
    std::vector<double> im;
    Eigen::VectorXd state;
    Eigen::VectorXd next;
  };
  Memory memory() const;
  static void clear(Memory& memory) noexcept;

  /// Adds y to out. Audio thread.
  void process(const double* input, int frames, Memory& memory, double* out) const noexcept;

 private:
  bool set_modes(const LongMatrix& step, const LongVector& entry, const LongRow& exit);
  void set_coupled(const LongMatrix& step, const LongVector& entry, const LongRow& exit);

  std::vector<double> pole_re_;
  std::vector<double> pole_im_;
  std::vector<double> residue_re_;
  std::vector<double> residue_im_;
  Eigen::MatrixXd step_;  // quasi-triangular; empty when there are modes
  Eigen::VectorXd entry_;
  Eigen::RowVectorXd exit_;
};

}  // namespace unsoldered
