#include "dsp/kernels_dispatch.h"

namespace unsoldered::plain {
#include "dsp/kernels_body.inc"
// What follows uses the vector type of the above.
#include "dsp/fourier_body.inc"
}  // namespace unsoldered::plain
