#include "src/wav_size.h"

#include <sys/stat.h>
#include <unistd.h>

#include <array>
#include <cstring>
#include <string_view>

namespace unsoldered {
namespace {

using Bytes = std::array<unsigned char, 16>;

std::uint64_t little_endian(const unsigned char* bytes, int count) noexcept {
  std::uint64_t value = 0;
  for (int i = count - 1; i >= 0; --i) value = value << 8 | bytes[i];
  return value;
}

bool read_at(int descriptor, std::uint64_t offset, std::size_t count, Bytes& bytes) noexcept {
  return ::pread(descriptor, bytes.data(), count, static_cast<off_t>(offset)) == static_cast<ssize_t>(count);
}

bool is_tag(const Bytes& bytes, std::size_t offset, std::string_view tag) noexcept {
  return std::memcmp(bytes.data() + offset, tag.data(), tag.size()) == 0;
}

}  // namespace

std::optional<std::uint64_t> missing_wav_bytes(int descriptor) noexcept {
  struct stat about {};
  if (::fstat(descriptor, &about) != 0) return std::nullopt;
  const auto file_size = static_cast<std::uint64_t>(about.st_size);

  Bytes bytes{};
  if (!read_at(descriptor, 0, 12, bytes) || !is_tag(bytes, 8, "WAVE")) return std::nullopt;
  if (!is_tag(bytes, 0, "RIFF") && !is_tag(bytes, 0, "RF64")) return std::nullopt;

  constexpr std::uint64_t kOpen32 = 0xffffffffu;
  constexpr std::uint64_t kOpen64 = 0xffffffffffffffffu;
  constexpr int kMostChunks = 4096;  // a file made of empty chunks must not keep us busy
  std::uint64_t long_size = 0;       // from ds64 (EBU Tech 3306), which comes first in an RF64 file
  std::uint64_t offset = 12;
  for (int chunk = 0; chunk < kMostChunks && read_at(descriptor, offset, 8, bytes); ++chunk) {
    std::uint64_t size = little_endian(bytes.data() + 4, 4);
    if (is_tag(bytes, 0, "data")) {
      if (size == kOpen32) size = long_size;
      if (size == 0 || size == kOpen64) return std::nullopt;
      const std::uint64_t there = file_size - (offset + 8);
      return size > there ? std::optional(size - there) : std::nullopt;
    }
    if (is_tag(bytes, 0, "ds64")) {
      if (!read_at(descriptor, offset + 8, 16, bytes)) return std::nullopt;
      long_size = little_endian(bytes.data() + 8, 8);
    }
    offset += 8 + size + (size & 1);  // chunks begin at even offsets
  }
  return std::nullopt;
}

}  // namespace unsoldered
