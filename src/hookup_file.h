// Hookup files: TOML to Hookup, every refusal with file, line, key, value and what is accepted.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "dsp/hookup.h"

namespace unsoldered {

/// Reads and checks a hookup file. `settings` are KEY=VALUE overrides as given to --set (`tone.dial=4`,
/// `cable.length=10 m`, `volume.taper=linear`, `extra.0.value=22k`); they act before the check. Throws InputError.
Hookup read_hookup(const std::filesystem::path& file, const std::vector<std::string>& settings = {});

/// The same from text; `name` stands for the file in messages, `folder` is where a measured taper's CSV is looked for.
Hookup parse_hookup(const std::string& toml, const std::string& name, const std::filesystem::path& folder,
                    const std::vector<std::string>& settings = {});

}  // namespace unsoldered
