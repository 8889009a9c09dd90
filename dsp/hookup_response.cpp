#include "dsp/hookup_response.h"

#include "dsp/hookup_network.h"

namespace unsoldered {

HookupResponse::HookupResponse(const Hookup& hookup, double dial) : analysis_(hookup_circuit(hookup, dial)) {}

std::complex<double> HookupResponse::value(double frequency_hz) { return analysis_.value(frequency_hz); }

Transfer HookupResponse::transfer(double frequency_hz) { return analysis_.transfer(frequency_hz); }

}  // namespace unsoldered
