// One table of a TOML document, read key by key; every refusal names place, key, value and what is accepted.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "dsp/quantity.h"
#include "src/toml_document.h"

namespace unsoldered {

/// Both ends are accepted; `unit` is for messages ("degrees") and may follow a number written as text.
struct NumberRange {
  double low = 0;
  double high = 0;
  std::string_view unit;
};

/// A view: document and table must outlive it. Every call throws InputError for what it refuses.
class TomlBlock {
 public:
  /// The document's root table.
  explicit TomlBlock(const TomlDocument& document);

  bool has(std::string_view key) const { return find(key) != nullptr; }
  const toml::node* find(std::string_view key) const { return table_->get(key); }

  /// "volume.taper": the dotted key from the root of the document.
  std::string dotted(std::string_view key) const;

  /// Refuses every key that is not among `keys`, naming the nearest and the list; for the keys in `misplaced` it says
  /// `reason`.
  void allow_only(const std::vector<std::string_view>& keys, const std::vector<std::string_view>& misplaced = {},
                  std::string_view reason = {}) const;

  double quantity(std::string_view key, Unit unit, Range range) const;
  std::optional<double> optional_quantity(std::string_view key, Unit unit, Range range) const;
  std::optional<double> optional_number(std::string_view key, const NumberRange& range) const;
  std::optional<bool> optional_flag(std::string_view key) const;
  std::optional<std::string> optional_text(std::string_view key) const;
  std::string text(std::string_view key, std::string_view wanted) const;

  /// Index of the value among `names`.
  std::size_t choice(std::string_view key, const std::vector<std::string_view>& names) const;
  std::optional<std::size_t> optional_choice(std::string_view key, const std::vector<std::string_view>& names) const;

  /// The key "tolerance", "20%" as 0.2.
  std::optional<double> tolerance() const;

  std::optional<TomlBlock> optional_block(std::string_view key) const;
  TomlBlock block(std::string_view key, std::string_view wanted) const;

  /// The tables of `[[key]]`; none when there are none.
  std::vector<TomlBlock> blocks(std::string_view key) const;

  /// One value that stands in the place of `key`, such as an entry of a list under it.
  double quantity_of(std::string_view key, const toml::node& value, Unit unit, Range range) const;
  double number_of(std::string_view key, const toml::node& value, const NumberRange& range) const;

  /// `why` starts with the value or with a word that follows 'key "volume.taper": '.
  [[noreturn]] void refuse(std::string_view key, const std::string& why) const;
  [[noreturn]] void refuse_missing(std::string_view key, std::string_view wanted) const;
  [[noreturn]] void refuse_type(std::string_view key, const toml::node& value, std::string_view wanted) const;

 private:
  TomlBlock(const TomlDocument& document, const toml::table& table, std::string path);

  const TomlDocument* document_;
  const toml::table* table_;
  std::string path_;
};

/// Keys of one list and of another.
std::vector<std::string_view> with(std::vector<std::string_view> keys, const std::vector<std::string_view>& more);

/// "a, b, c" with each name in double quotes.
std::string quoted_list(const std::vector<std::string_view>& names);

/// The name that `word` is most likely a slip of; empty when none is near.
std::string_view nearest(std::string_view word, const std::vector<std::string_view>& names);

}  // namespace unsoldered
