// Hookup files: TOML to Hookup, every refusal with file, line, key, value and what is accepted.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "dsp/hookup.h"
#include "src/toml_document.h"

namespace unsoldered {

/// Reads and checks a hookup file. `settings` are KEY=VALUE overrides as given to --set (`tone.dial=4`,
/// `cable.length=10 m`, `volume.taper=linear`, `extra.0.value=22k`); they act before the check. Throws InputError.
Hookup read_hookup(const std::filesystem::path& file, const std::vector<std::string>& settings = {});

/// The same from text; `name` stands for the file in messages, `folder` is where a measured taper's CSV is looked for.
Hookup parse_hookup(const std::string& toml, const std::string& name, const std::filesystem::path& folder,
                    const std::vector<std::string>& settings = {});

/// The same from a document whose settings and catalogue names are already applied (catalogue.h), such as a hookup that
/// stands in a job.
Hookup hookup_from(const TomlDocument& document, const std::filesystem::path& folder);

/// The CSV files of measured tapers that a hookup names.
std::vector<std::filesystem::path> measured_files(const toml::table& hookup, const std::filesystem::path& folder);

/// The files that are read for a hookup: the file itself and those of measured tapers. Throws as read_hookup does.
std::vector<std::filesystem::path> files_of_hookup(const std::filesystem::path& file,
                                                   const std::vector<std::string>& settings = {});

/// compute(), whose refusal of the network (one without a solution) then names the file.
template <typename Compute>
auto of_hookup(const std::filesystem::path& file, const Compute& compute) {
  try {
    return compute();
  } catch (const InputError& error) {
    throw InputError(file.string() + ": " + error.what());
  }
}

}  // namespace unsoldered
