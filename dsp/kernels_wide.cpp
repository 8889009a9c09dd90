// Compiled for x86-64-v3 where the compiler knows it (see CMakeLists.txt); never entered on a lesser machine.
#include "dsp/kernels_dispatch.h"

namespace unsoldered::wide {
#include "dsp/kernels_body.inc"
}  // namespace unsoldered::wide
