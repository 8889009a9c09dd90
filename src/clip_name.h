// File names of clips: TAKE_HOOKUP_dial-07.50.wav, TAKE_HOOKUP_turn.wav.
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <string_view>

namespace unsoldered {

/// `text` as part of a file name on any system: letters, digits, '.', '_', '-' and letters beyond ASCII (valid UTF-8)
/// stay, every other character becomes '-', and so does a leading dot.
std::string safe_name(std::string_view text);

/// File name without folder and without ".hookup.toml" (or its last ending when that is another).
std::string hookup_stem(const std::filesystem::path& file);

/// `dial` empty: the knob turns.
std::string clip_name(std::string_view take, std::string_view hookup, std::optional<double> dial,
                      std::string_view ending = ".wav");

}  // namespace unsoldered
