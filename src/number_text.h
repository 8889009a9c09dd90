// Numbers as text, the same in every locale, and words in a row.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace unsoldered {

/// printf's %.9g with a decimal point whatever the locale says; "inf", "-inf" and "nan" for what is not finite.
std::string format_number(double value);

/// The finite number `text` is, white space round it allowed, nothing else; empty when it is not one.
std::optional<double> parse_number(std::string_view text) noexcept;

/// `text` without white space at its ends.
std::string_view trimmed(std::string_view text) noexcept;

/// "a, b and c" with `last` as the word before the last one.
std::string in_a_row(const std::vector<std::string>& words, std::string_view last);

}  // namespace unsoldered
