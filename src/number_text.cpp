#include "src/number_text.h"

#include <array>
#include <charconv>
#include <cmath>
#include <system_error>

namespace unsoldered {

std::string format_number(double value) {
  std::array<char, 32> text{};  // the longest is "-1.23456789e-308"
  const auto end = std::to_chars(text.data(), text.data() + text.size(), value, std::chars_format::general, 9).ptr;
  return {text.data(), end};
}

std::optional<double> parse_number(std::string_view text) noexcept {
  text = trimmed(text);
  if (!text.empty() && text.front() == '+') text.remove_prefix(1);  // from_chars knows no plus sign
  if (!text.empty() && text.front() == '+') return std::nullopt;
  double value = 0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc() || end != text.data() + text.size() || !std::isfinite(value)) return std::nullopt;
  return value;
}

std::string_view trimmed(std::string_view text) noexcept {
  constexpr std::string_view kWhite = " \t\r\n\v\f";
  const auto first = text.find_first_not_of(kWhite);
  if (first == std::string_view::npos) return {};
  return text.substr(first, text.find_last_not_of(kWhite) - first + 1);
}

std::string in_a_row(const std::vector<std::string>& words, std::string_view last) {
  std::string text;
  for (std::size_t i = 0; i < words.size(); ++i) {
    if (i > 0) text += i + 1 == words.size() ? " " + std::string(last) + " " : ", ";
    text += words[i];
  }
  return text;
}

}  // namespace unsoldered
