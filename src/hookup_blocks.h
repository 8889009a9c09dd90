// The blocks of a hookup file, each from its table: source, volume, treble bleed, tone, cable, second source, selector,
// blend, further stage, load. Every call throws InputError for what it refuses.
#pragma once

#include <filesystem>

#include "dsp/hookup.h"
#include "src/toml_block.h"

namespace unsoldered {

Source read_source(const TomlBlock& block);

/// `with_dial`: the block may say where the knob stands; the main volume's position is given with the call.
Volume read_volume(const TomlBlock& block, const std::filesystem::path& folder, bool with_dial);

TrebleBleed read_treble_bleed(const TomlBlock& block);
Tone read_tone(const TomlBlock& block, const std::filesystem::path& folder);
Cable read_cable(const TomlBlock& block);
Load read_load(const TomlBlock& block);
SecondSource read_second(const TomlBlock& block, const std::filesystem::path& folder);
Selector read_selector(const TomlBlock& block);
Blend read_blend(const TomlBlock& block);
Stage read_stage(const TomlBlock& block, const std::filesystem::path& folder);

}  // namespace unsoldered
