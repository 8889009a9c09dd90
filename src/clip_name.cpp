#include "src/clip_name.h"

#include <array>
#include <charconv>

namespace unsoldered {
namespace {

struct Letter {
  std::size_t bytes = 1;
  char32_t code = 0xfffd;  // what is not valid UTF-8, one byte at a time
};

/// The first letter of a text that is not empty.
Letter first_letter(std::string_view text) {
  const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(text[i]); };
  const unsigned lead = byte(0);
  if (lead < 0x80) return {1, lead};
  const std::size_t bytes = lead >= 0xf0 ? 4 : lead >= 0xe0 ? 3 : 2;
  if (lead < 0xc2 || lead > 0xf4 || text.size() < bytes) return {};
  char32_t code = lead & (0x7fu >> bytes);
  for (std::size_t i = 1; i < bytes; ++i) {
    if ((byte(i) & 0xc0u) != 0x80) return {};
    code = code << 6 | (byte(i) & 0x3fu);
  }
  constexpr std::array<char32_t, 5> kShortest = {0, 0, 0x80, 0x800, 0x10000};
  if (code < kShortest[bytes] || code > 0x10ffff || (code >= 0xd800 && code <= 0xdfff)) return {};
  return {bytes, code};
}

bool is_safe(char32_t code) {
  if (code < 0x80) {
    return (code >= '0' && code <= '9') || (code >= 'A' && code <= 'Z') || (code >= 'a' && code <= 'z') ||
           code == '.' || code == '_' || code == '-';
  }
  // Control characters, no-break space, the block of odd spaces and direction marks, ideographic space, private use and
  // everything from U+FE00 on (variation selectors, byte order mark, replacement character) that is not a plane of its own.
  if (code <= 0xa0 || (code >= 0x2000 && code <= 0x206f) || code == 0x3000) return false;
  return code < 0xe000 || (code >= 0xf900 && code < 0xfe00) || (code >= 0x10000 && code < 0xe0000);
}

}  // namespace

std::string safe_name(std::string_view text) {
  std::string name;
  while (!text.empty()) {
    const Letter letter = first_letter(text);
    if (is_safe(letter.code)) {
      name += text.substr(0, letter.bytes);
    } else {
      name += '-';
    }
    text.remove_prefix(letter.bytes);
  }
  if (!name.empty() && name.front() == '.') name.front() = '-';  // would be hidden
  return name;
}

std::string hookup_stem(const std::filesystem::path& file) {
  constexpr std::string_view kEnding = ".hookup.toml";
  const std::string name = file.filename().string();
  if (name.size() > kEnding.size() && name.ends_with(kEnding)) return name.substr(0, name.size() - kEnding.size());
  return file.stem().string();
}

std::string clip_name(std::string_view take, std::string_view hookup, std::optional<double> dial,
                      std::string_view ending) {
  std::string name = safe_name(take) + '_' + safe_name(hookup);
  if (!dial) return name.append("_turn").append(ending);
  std::array<char, 8> text{};
  const auto end = std::to_chars(text.data(), text.data() + text.size(), *dial, std::chars_format::fixed, 2).ptr;
  const std::string digits(text.data(), end);
  return name.append("_dial-").append(digits.size() < 5 ? "0" : "").append(digits).append(ending);  // 00.00 to 10.00
}

}  // namespace unsoldered
