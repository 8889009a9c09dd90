#include "src/toml_document.h"

#include <algorithm>
#include <array>
#include <cerrno>
#include <charconv>
#include <fstream>
#include <optional>
#include <sstream>
#include <system_error>
#include <utility>
#include <vector>

#include "dsp/error.h"
#include "src/number_text.h"
#include "src/system_text.h"

namespace unsoldered {
namespace {

constexpr std::size_t kLargestFile = std::size_t{1} << 20;
constexpr int kLongestKeyChain = 32;
constexpr std::string_view kSettingPlace = "--set ";

/// Line of the first dotted key that chains deeper than any of our files needs; 0 when there is none. Parsed tables are
/// taken down by recursion, so a file made to be deep would otherwise run out of stack; nested brackets the parser
/// bounds itself (256, so a parsed table is at most some 8000 levels deep, well under a megabyte of stack). Looks at
/// the bare text: dots in a sentence count as well, up to its next comma, bracket or line end.
std::size_t too_deep_at(std::string_view text) {
  constexpr std::string_view ends_a_key = "\n[]{}=,#";
  std::size_t line = 1;
  int chain = 0;
  char before = '\0';
  for (char c : text) {
    line += c == '\n' ? 1 : 0;
    if (ends_a_key.find(c) != std::string_view::npos) {
      chain = 0;
    } else if (c == '.' && before != '.') {  // "..." is prose, never a key
      ++chain;
    }
    before = c;
    if (chain > kLongestKeyChain) {
      return line;
    }
  }
  return 0;
}

toml::table parse_table(std::string_view text, const std::string& source_name, std::string_view shown_name) {
  if (const std::size_t line = too_deep_at(text)) {
    throw InputError(std::string(shown_name) + ":" + std::to_string(line) +
                     ": more than 32 dots in one key or sentence; no file of ours nests that deep, shorten it");
  }
  return toml::parse(text, source_name);
}

std::string without_control_letters(std::string_view text) {
  std::string out;
  for (const char c : text) {
    const auto code = static_cast<unsigned char>(c);
    out += code < 0x20 || code == 0x7f ? '?' : c;
  }
  return out;
}

/// The next step for what the parser says.
std::string toml_advice(std::string_view what) {
  const auto says = [&](std::string_view words) { return what.find(words) != std::string_view::npos; };
  if (says("utf-8")) return "a hookup is plain text: save it as UTF-8, and check that this is the right file";
  if (says("parsing string")) return "correct this line; is a double quote missing at the end of a text?";
  if (says("redefine")) return "a key or block stands here twice; correct this line or take it out";
  return "correct this line (text values stand in double quotes)";
}

std::vector<std::string> key_parts(std::string_view key) {
  std::vector<std::string> parts(1);
  for (char c : key) {
    if (c == '.') {
      parts.emplace_back();
    } else {
      parts.back() += c;
    }
  }
  return parts;
}

std::optional<std::size_t> as_index(const std::string& part) {
  std::size_t index = 0;
  const auto read = std::from_chars(part.data(), part.data() + part.size(), index);
  if (read.ec != std::errc() || read.ptr != part.data() + part.size()) {
    return std::nullopt;
  }
  return index;
}

/// The child of a table or array; null when there is none.
const toml::node* child(const toml::node& parent, const std::string& part) {
  if (const toml::table* table = parent.as_table()) {
    return table->get(part);
  }
  const toml::array* array = parent.as_array();
  const std::optional<std::size_t> index = as_index(part);
  return array != nullptr && index && *index < array->size() ? array->get(*index) : nullptr;
}

/// VALUE as a basic string of TOML.
std::string as_toml_string(std::string_view value) {
  constexpr std::string_view hex = "0123456789abcdef";
  std::string out = "\"";
  for (char c : value) {
    const auto code = static_cast<unsigned char>(c);
    if (c == '"' || c == '\\') {
      out += '\\';
      out += c;
    } else if (code < 0x20 || code == 0x7f) {
      out += "\\u00";
      out += hex[code >> 4];
      out += hex[code & 15];
    } else {
      out += c;
    }
  }
  return out + "\"";
}

/// A table with the one entry "value". Empty when `text` is no TOML value.
std::optional<toml::table> parse_value(std::string_view text, const std::string& place) {
  try {
    toml::table table = parse_table("value = " + std::string(text), place, place);
    if (table.size() == 1 && table.contains("value")) {
      return table;
    }
  } catch (const toml::parse_error&) {
    return std::nullopt;
  }
  return std::nullopt;
}

toml::table parse_setting_value(std::string_view value, const std::string& place) {
  const std::string_view bare = trimmed(value);
  if (std::optional<toml::table> table = parse_value(bare, place); table && !bare.empty()) {
    return std::move(*table);
  }
  if (std::optional<toml::table> table = parse_value(as_toml_string(value), place)) {
    return std::move(*table);
  }
  throw InputError(place + ": the value is not valid UTF-8 text; write it in UTF-8");
}

/// Walks one part down from `parent`, making the empty table or array that is missing. Null when the part cannot be
/// there.
toml::node* step(toml::node& parent, const std::string& part, bool next_is_index, const std::string& place) {
  const auto make = [&]() { return parse_value(next_is_index ? "[]" : "{}", place); };
  if (toml::table* table = parent.as_table()) {
    if (toml::node* found = table->get(part)) {
      return found;
    }
    toml::table made = *make();
    made.get("value")->visit([&](auto& node) { table->insert_or_assign(part, std::move(node)); });
    return table->get(part);
  }
  toml::array* array = parent.as_array();
  const std::optional<std::size_t> index = as_index(part);
  if (array == nullptr || !index || *index > array->size()) {
    return nullptr;
  }
  if (*index == array->size()) {
    toml::table made = *make();
    made.get("value")->visit([&](auto& node) { array->push_back(std::move(node)); });
  }
  return array->get(*index);
}

void put(toml::node& parent, const std::string& part, toml::node& value, const std::string& place) {
  value.visit([&](auto& node) {
    if (toml::table* table = parent.as_table()) {
      table->insert_or_assign(part, std::move(node));
      return;
    }
    toml::array* array = parent.as_array();
    const std::optional<std::size_t> index = as_index(part);
    if (array == nullptr || !index || *index > array->size()) {
      throw InputError(place + ": there is no place " + in_quotes(part) + " there; " +
                       (array == nullptr ? "the key before it holds a value, not a table"
                                         : "the list has " + std::to_string(array->size()) +
                                               " entries, counted from 0, and one may be added at its end"));
    }
    if (*index < array->size()) {
      array->erase(array->begin() + static_cast<std::ptrdiff_t>(*index));
    }
    array->insert(array->begin() + static_cast<std::ptrdiff_t>(*index), std::move(node));
  });
}

}  // namespace

std::string in_quotes(std::string_view text) {
  constexpr std::size_t longest = 80;
  return '"' + without_control_letters(text.substr(0, longest)) + (text.size() > longest ? "\xE2\x80\xA6\"" : "\"");
}

std::string read_small_file(const std::filesystem::path& file) {
  const std::string name = file.string();
  if (name.empty()) {
    throw InputError("\"\": there is no such file, the file name is empty; give one");
  }
  std::error_code error;
  const std::filesystem::file_status status = std::filesystem::status(file, error);
  if (status.type() == std::filesystem::file_type::not_found) {
    throw InputError(name + ": there is no such file; check the name and the folder");
  }
  if (error) {
    const bool too_long = error == std::errc::filename_too_long;
    throw InputError(name + ": cannot be looked at (" + error.message() + "); check the " +
                     (too_long ? "name" : "permissions of the folder"));
  }
  if (std::filesystem::is_directory(status)) {
    throw InputError(name + ": is a folder; name a file in it");
  }
  if (!std::filesystem::is_regular_file(status)) {
    throw InputError(name + ": is not a regular file; give a text file");
  }
  std::ifstream stream(file, std::ios::binary);
  if (!stream) {
    throw CannotError(name + ": cannot be opened for reading: " + system_text(errno) + "; check its permissions");
  }
  // One byte more than allowed is read, whatever size the system reports.
  std::string text(kLargestFile + 1, '\0');
  stream.read(text.data(), static_cast<std::streamsize>(text.size()));
  text.resize(static_cast<std::size_t>(stream.gcount()));
  if (stream.bad()) {
    throw CannotError(name + ": cannot be read; check the disk it is on");
  }
  if (text.size() > kLargestFile) {
    throw InputError(name + ": is larger than 1 MiB, the most a text file of ours may have; is it the right file?");
  }
  return text;
}

TomlDocument parse_toml(std::string_view text, const std::string& name) {
  try {
    return {name, parse_table(text, name, name)};
  } catch (const toml::parse_error& error) {
    const std::string_view what = error.description();
    throw InputError(name + ":" + std::to_string(error.source().begin.line) +
                     ": not valid TOML: " + without_control_letters(what) + "; " + toml_advice(what));
  }
}

void apply_setting(TomlDocument& document, const std::string& setting) {
  const std::string shown = in_quotes(setting);
  const std::string place = std::string(kSettingPlace) + shown.substr(1, shown.size() - 2);
  const std::size_t equals = setting.find('=');
  if (equals == std::string::npos) {
    throw InputError("--set " + shown + " has no equals sign; wanted is KEY=VALUE, as in --set tone.dial=4");
  }
  const std::string key(trimmed(std::string_view(setting).substr(0, equals)));
  const std::vector<std::string> parts = key_parts(key);
  const auto is_key = [](const std::string& part) {
    return !part.empty() && std::all_of(part.begin(), part.end(), [](char c) {
      return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_' || c == '-';
    });
  };
  if (parts.size() > 8 || !std::all_of(parts.begin(), parts.end(), is_key)) {
    throw InputError(place + ": " + in_quotes(key) + " is not a key; wanted is KEY=VALUE, as in --set tone.dial=4");
  }
  toml::table value = parse_setting_value(std::string_view(setting).substr(equals + 1), place);
  toml::node* at = &document.root;
  for (std::size_t i = 0; i + 1 < parts.size(); ++i) {
    toml::node* next = step(*at, parts[i], as_index(parts[i + 1]).has_value(), place);
    if (next == nullptr) {
      throw InputError(
          place + ": there is no " + in_quotes(parts[i]) + " there; " +
          (at->is_array() ? "entries are counted from 0" : "the key before it holds a value, not a table"));
    }
    at = next;
  }
  put(*at, parts.back(), *value.get("value"), place);
}

std::string place_of(const TomlDocument& document, const toml::node& node) {
  const toml::source_region& source = node.source();
  if (source.path && *source.path != document.name) {
    return *source.path;  // laid over the document: by --set, or from the catalogue
  }
  return source.begin.line == 0 ? document.name : document.name + ":" + std::to_string(source.begin.line);
}

std::string place_of(const TomlDocument& document, std::string_view dotted_key) {
  const toml::node* at = &document.root;
  for (const std::string& part : key_parts(dotted_key)) {
    const toml::node* next = child(*at, part);
    if (next == nullptr) {
      break;
    }
    at = next;
  }
  return at == &document.root ? document.name : place_of(document, *at);
}

}  // namespace unsoldered
