#include "dsp/kernels_dispatch.h"

namespace unsoldered::plain {
#include "dsp/kernels_body.inc"
}  // namespace unsoldered::plain
