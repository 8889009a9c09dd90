// The keys of a pot in a hookup file: total, law, travel, dead travel, end resistance, ohmmeter readings.
#pragma once

#include <filesystem>
#include <string_view>
#include <vector>

#include "dsp/pot.h"
#include "src/toml_block.h"

namespace unsoldered {

/// The keys `read_pot` reads, apart from the one for the total resistance.
std::vector<std::string_view> pot_keys();

/// `total_key` is "resistance", or "value" in an extra part. `measured_total` stands in for the total; `measured_half`
/// beats the name of the law. A measured taper's CSV is looked for in `folder`. `like` gives
/// what the block leaves out, as for the second gang of a stereo pot. Throws InputError.
Pot read_pot(const TomlBlock& block, std::string_view total_key, const std::filesystem::path& folder,
             const Pot* like = nullptr);

}  // namespace unsoldered
