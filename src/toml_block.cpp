#include "src/toml_block.h"

#include <algorithm>
#include <numeric>
#include <utility>

#include "dsp/error.h"
#include "src/number_text.h"

namespace unsoldered {
namespace {

/// Levenshtein distance: single characters added, dropped or changed.
std::size_t edit_distance(std::string_view a, std::string_view b) {
  std::vector<std::size_t> row(b.size() + 1);
  std::iota(row.begin(), row.end(), std::size_t{0});
  for (std::size_t i = 1; i <= a.size(); ++i) {
    std::size_t diagonal = row[0];
    row[0] = i;
    for (std::size_t j = 1; j <= b.size(); ++j) {
      const std::size_t change = diagonal + (a[i - 1] == b[j - 1] ? 0 : 1);
      diagonal = row[j];
      row[j] = std::min({row[j] + 1, row[j - 1] + 1, change});
    }
  }
  return row.back();
}

/// A value as it may stand in a message.
std::string shown(const toml::node& value) {
  if (const auto* text = value.as_string()) {
    return in_quotes(text->get());
  }
  if (const auto* integer = value.as_integer()) {
    return std::to_string(integer->get());
  }
  if (const auto* number = value.as_floating_point()) {
    return format_number(number->get());
  }
  if (const auto* flag = value.as_boolean()) {
    return flag->get() ? "true" : "false";
  }
  return value.is_table() ? "a table" : value.is_array() ? "a list" : "a date or time";
}

std::optional<double> plain_number(const toml::node& value) {
  if (const auto* integer = value.as_integer()) {
    return static_cast<double>(integer->get());
  }
  if (const auto* number = value.as_floating_point()) {
    return number->get();
  }
  return std::nullopt;
}

}  // namespace

std::vector<std::string_view> with(std::vector<std::string_view> keys, const std::vector<std::string_view>& more) {
  keys.insert(keys.end(), more.begin(), more.end());
  return keys;
}

std::string quoted_list(const std::vector<std::string_view>& names) {
  std::string out;
  for (std::string_view name : names) {
    out += (out.empty() ? "" : ", ") + in_quotes(name);
  }
  return out;
}

std::string_view nearest(std::string_view word, const std::vector<std::string_view>& names) {
  if (word.size() > 64) {
    return {};
  }
  std::string_view best;
  std::size_t best_distance = std::max<std::size_t>(2, word.size() / 3) + 1;
  for (std::string_view name : names) {
    const std::size_t distance = edit_distance(word, name);
    if (distance < best_distance && distance < name.size()) {
      best = name;
      best_distance = distance;
    }
  }
  return best;
}

TomlBlock::TomlBlock(const TomlDocument& document) : TomlBlock(document, document.root, "") {}

TomlBlock::TomlBlock(const TomlDocument& document, const toml::table& table, std::string path)
    : document_(&document), table_(&table), path_(std::move(path)) {}

std::string TomlBlock::dotted(std::string_view key) const {
  return path_.empty() ? std::string(key) : path_ + "." + std::string(key);
}

void TomlBlock::allow_only(const std::vector<std::string_view>& keys, const std::vector<std::string_view>& misplaced,
                           std::string_view reason) const {
  for (const auto& [key, value] : *table_) {
    const std::string_view name = key.str();
    if (std::find(keys.begin(), keys.end(), name) != keys.end()) {
      continue;
    }
    const std::string_view near = nearest(name, keys);
    std::string why = "not a key known here; a";
    if (std::find(misplaced.begin(), misplaced.end(), name) != misplaced.end()) {
      why = std::string(reason) + "; a";
    } else if (!near.empty()) {
      why = "not a key known here; was " + in_quotes(near) + " meant? A";
    }
    refuse(name, why + "ccepted are " + quoted_list(keys));
  }
}

double TomlBlock::quantity_of(std::string_view key, const toml::node& value, Unit unit, Range range) const {
  try {
    if (const auto* text = value.as_string()) {
      return parse_quantity(text->get(), unit, range);
    }
    if (const std::optional<double> number = plain_number(value)) {
      return require_in_range(*number, unit, range);
    }
  } catch (const InputError& error) {
    refuse(key, error.what());
  }
  refuse_type(key, value,
              "a value in double quotes from " + format_quantity(range.low, unit) + " to " +
                  format_quantity(range.high, unit) + ", or a bare number");
}

double TomlBlock::quantity(std::string_view key, Unit unit, Range range) const {
  const toml::node* value = find(key);
  if (value == nullptr) {
    refuse_missing(key,
                   "a value from " + format_quantity(range.low, unit) + " to " + format_quantity(range.high, unit));
  }
  return quantity_of(key, *value, unit, range);
}

std::optional<double> TomlBlock::optional_quantity(std::string_view key, Unit unit, Range range) const {
  const toml::node* value = find(key);
  return value == nullptr ? std::nullopt : std::optional<double>(quantity_of(key, *value, unit, range));
}

double TomlBlock::number_of(std::string_view key, const toml::node& value, const NumberRange& range) const {
  const std::string unit = range.unit.empty() ? "" : " " + std::string(range.unit);
  const std::string accepted = "; accepted is " + format_number(range.low) + " to " + format_number(range.high) + unit;
  std::optional<double> number = plain_number(value);
  if (const auto* text = value.as_string()) {
    std::string_view digits = trimmed(text->get());
    if (!range.unit.empty() && digits.size() > range.unit.size() &&
        digits.substr(digits.size() - range.unit.size()) == range.unit) {
      digits.remove_suffix(range.unit.size());
    }
    number = parse_number(digits);
    if (!number) {
      const bool comma = digits.find(',') != std::string_view::npos;
      refuse(key, shown(value) + (comma ? " has a comma; the decimal sign is a point" : " is not a number") + accepted);
    }
  }
  if (!number) {
    refuse_type(key, value, "a number from " + format_number(range.low) + " to " + format_number(range.high) + unit);
  }
  if (!(*number >= range.low && *number <= range.high)) {
    refuse(key, format_number(*number) + unit + " is out of range" + accepted);
  }
  return *number;
}

std::optional<double> TomlBlock::optional_number(std::string_view key, const NumberRange& range) const {
  const toml::node* value = find(key);
  return value == nullptr ? std::nullopt : std::optional<double>(number_of(key, *value, range));
}

std::optional<bool> TomlBlock::optional_flag(std::string_view key) const {
  const toml::node* value = find(key);
  if (value == nullptr) {
    return std::nullopt;
  }
  if (const auto* flag = value->as_boolean()) {
    return flag->get();
  }
  refuse_type(key, *value, "true or false, without quotes");
}

std::optional<std::string> TomlBlock::optional_text(std::string_view key) const {
  const toml::node* value = find(key);
  if (value == nullptr) {
    return std::nullopt;
  }
  const auto* text = value->as_string();
  if (text == nullptr) {
    refuse_type(key, *value, "text in double quotes");
  }
  const std::string& content = text->get();
  if (std::any_of(content.begin(), content.end(),
                  [](char c) { return static_cast<unsigned char>(c) < 0x20 || c == 0x7f; })) {
    refuse(key, in_quotes(content) + " has a line end or another control character; write it in one plain line");
  }
  return content;
}

std::string TomlBlock::text(std::string_view key, std::string_view wanted) const {
  std::optional<std::string> value = optional_text(key);
  if (!value) {
    refuse_missing(key, wanted);
  }
  return *value;
}

std::optional<std::size_t> TomlBlock::optional_choice(std::string_view key,
                                                      const std::vector<std::string_view>& names) const {
  const std::optional<std::string> value = optional_text(key);
  if (!value) {
    return std::nullopt;
  }
  const auto found = std::find(names.begin(), names.end(), *value);
  if (found == names.end()) {
    refuse(key, in_quotes(*value) + " is not known; accepted are " + quoted_list(names));
  }
  return static_cast<std::size_t>(found - names.begin());
}

std::size_t TomlBlock::choice(std::string_view key, const std::vector<std::string_view>& names) const {
  const std::optional<std::size_t> index = optional_choice(key, names);
  if (!index) {
    refuse_missing(key, quoted_list(names));
  }
  return *index;
}

std::optional<double> TomlBlock::tolerance() const {
  const toml::node* value = find("tolerance");
  if (value == nullptr) {
    return std::nullopt;
  }
  const auto* text = value->as_string();
  if (text == nullptr) {
    refuse_type("tolerance", *value, "a percentage in double quotes, as in \"20%\"");
  }
  try {
    return parse_percent(text->get());
  } catch (const InputError& error) {
    refuse("tolerance", error.what());
  }
}

std::optional<TomlBlock> TomlBlock::optional_block(std::string_view key) const {
  const toml::node* value = find(key);
  if (value == nullptr) {
    return std::nullopt;
  }
  const toml::table* table = value->as_table();
  if (table != nullptr) {
    return TomlBlock(*document_, *table, dotted(key));
  }
  refuse_type(key, *value, "a block that starts with [" + dotted(key) + "]");
}

TomlBlock TomlBlock::block(std::string_view key, std::string_view wanted) const {
  std::optional<TomlBlock> found = optional_block(key);
  if (!found) {
    throw InputError(document_->name + ": block [" + dotted(key) + "] is missing; wanted is " + std::string(wanted));
  }
  return *found;
}

std::vector<TomlBlock> TomlBlock::blocks(std::string_view key) const {
  const toml::node* value = find(key);
  if (value == nullptr) {
    return {};
  }
  const std::string wanted = "blocks that start with [[" + dotted(key) + "]]";
  const toml::array* list = value->as_array();
  if (list == nullptr) {
    refuse_type(key, *value, wanted);
  }
  std::vector<TomlBlock> out;
  for (std::size_t i = 0; i < list->size(); ++i) {
    const toml::table* table = (*list)[i].as_table();
    if (table == nullptr) {
      refuse_type(key, (*list)[i], wanted);
    }
    out.push_back(TomlBlock(*document_, *table, dotted(key) + "." + std::to_string(i)));
  }
  return out;
}

void TomlBlock::refuse(std::string_view key, const std::string& why) const {
  const toml::node* value = find(key);
  const std::string shown_key = in_quotes(dotted(key));
  throw InputError(place_of(*document_, value == nullptr ? *table_ : *value) + ": key " + shown_key + ": " + why);
}

void TomlBlock::refuse_missing(std::string_view key, std::string_view wanted) const {
  throw InputError(place_of(*document_, *table_) + ": key " + in_quotes(dotted(key)) + " is missing; wanted is " +
                   std::string(wanted));
}

void TomlBlock::refuse_type(std::string_view key, const toml::node& value, std::string_view wanted) const {
  refuse(key, shown(value) + " cannot stand here; wanted is " + std::string(wanted));
}

}  // namespace unsoldered
