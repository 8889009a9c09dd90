// A TOML text with where it came from, and --set on top of it.
#pragma once

#include <toml++/toml.h>

#include <filesystem>
#include <string>
#include <string_view>

namespace unsoldered {

/// `text` in double quotes, control characters shown as '?', cut after 80 bytes: safe to print whatever a file held.
std::string in_quotes(std::string_view text);

/// The whole of a small text file. Throws InputError for what is not a regular file, is larger than 1 MiB or cannot be
/// read.
std::string read_small_file(const std::filesystem::path& file);

struct TomlDocument {
  std::string name;  // stands for the file in messages
  toml::table root;
};

/// Throws InputError with name and line for what is not TOML, and for keys nested deeper than any of our files has.
TomlDocument parse_toml(std::string_view text, const std::string& name);

/// Lays one KEY=VALUE of --set over the document. KEY is dotted, a number picks an entry of an array; missing tables
/// are made, and so is the entry just past the end of an array. VALUE is a TOML value if it reads as one, else a plain
/// string (`22n`, `10 m`, `audio 15%`). Throws InputError.
void apply_setting(TomlDocument& document, const std::string& setting);

/// Where a value was written: "guitar.hookup.toml:12", or "--set tone.dial=44". What was parsed under another name than
/// the document's and laid over it has that name for its place.
std::string place_of(const TomlDocument& document, const toml::node& node);

/// Where the value at a dotted key was written, or the nearest table round it.
std::string place_of(const TomlDocument& document, std::string_view dotted_key);

}  // namespace unsoldered
