// A measured taper: a CSV file of travel and resistance.
//
// Two columns, separated by a comma: travel 0..1 (electrical travel, 0 = counter-clockwise), then either the resistance
// share 0..1 or ohmmeter readings from the bottom lug to the wiper (500, 4k7), known by a last value above 1. Readings
// are taken between the first and the last: r = (R - R_first)/(R_last - R_first), so that the end resistances drop out.
// A first line without numbers is a header; empty lines and lines that start with # are passed over.
#pragma once

#include <filesystem>
#include <string>
#include <string_view>

#include "dsp/taper.h"

namespace unsoldered {

/// Reads `file`, a path relative to `folder` that may not lead out of it (links included). Throws InputError with file
/// and line.
Taper read_measured_taper(const std::filesystem::path& folder, const std::string& file);

/// The same from text; `name` stands for the file in messages.
Taper parse_measured_taper(std::string_view csv, const std::string& name);

}  // namespace unsoldered
