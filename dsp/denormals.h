// Denormal numbers off for the length of a scope: a decaying filter would otherwise run a hundred times slower.
#pragma once

#if defined(__SSE2__)
#include <xmmintrin.h>
#endif

namespace unsoldered {

class DenormalsOff {
 public:
#if defined(__SSE2__)
  DenormalsOff() noexcept : before_(_mm_getcsr()) { _mm_setcsr(before_ | flush_to_zero | denormals_are_zero); }
  ~DenormalsOff() { _mm_setcsr(before_); }

 private:
  static constexpr unsigned flush_to_zero = 0x8000;
  static constexpr unsigned denormals_are_zero = 0x0040;
  unsigned before_;

 public:
#else
  DenormalsOff() noexcept = default;
#endif
  DenormalsOff(const DenormalsOff&) = delete;
  DenormalsOff& operator=(const DenormalsOff&) = delete;
};

}  // namespace unsoldered
