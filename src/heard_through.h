// What a clip is heard through after the load, when listening only: a loudspeaker or an impulse response. Never in the
// numbers.
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "src/convolved_stream.h"
#include "src/take.h"

namespace unsoldered {

inline constexpr double kLongestImpulseResponseSeconds = 10;

struct HeardThrough {
  ChannelPlans plans;
  std::vector<std::filesystem::path> inputs = {};  // what was read for it
  std::string warning = {};                        // empty: none
};

/// "nothing": empty. "guitar loudspeaker" or "guitar-loudspeaker": dsp/loudspeaker.h. Else an impulse response: a sound file
/// of the take's rate, one channel for all or as many as the take, up to 10 s; used as it is, neither normalised nor with
/// its latency removed. Throws InputError, its message opened by `where`, or CannotError.
std::optional<HeardThrough> open_heard_through(const std::string& text, const TakeFormat& take,
                                               const std::string& where);

}  // namespace unsoldered
