#include "src/missing_sound.h"

#include <sys/stat.h>
#include <unistd.h>

#include <array>
#include <cstring>
#include <string_view>

namespace unsoldered {
namespace {

using Bytes = std::array<unsigned char, 40>;
using Missing = std::optional<std::uint64_t>;

constexpr std::uint64_t kOpen32 = 0xffffffffu;
constexpr std::uint64_t kOpen64 = 0xffffffffffffffffu;
constexpr int kMostChunks = 4096;  // a file made of empty chunks must not keep us busy

/// A W64 chunk is named by a GUID: these four letters, then the same twelve bytes in all but the first chunk.
constexpr std::string_view kW64Tail{"\xf3\xac\xd3\x11\x8c\xd1\x00\xc0\x4f\x8e\xdb\x8a", 12};
constexpr std::string_view kW64First{"riff\x2e\x91\xcf\x11\xa5\xd6\x28\xdb\x04\xc1\x00\x00", 16};

std::uint64_t little_endian(const unsigned char* bytes, int count) noexcept {
  std::uint64_t value = 0;
  for (int i = count - 1; i >= 0; --i) value = value << 8 | bytes[i];
  return value;
}

std::uint64_t big_endian(const unsigned char* bytes, int count) noexcept {
  std::uint64_t value = 0;
  for (int i = 0; i < count; ++i) value = value << 8 | bytes[i];
  return value;
}

bool is_tag(const Bytes& bytes, std::size_t offset, std::string_view tag) noexcept {
  return std::memcmp(bytes.data() + offset, tag.data(), tag.size()) == 0;
}

/// A file as its chunks are walked.
struct File {
  int descriptor;
  std::uint64_t size;
  Bytes bytes{};

  bool read(std::uint64_t offset, std::size_t count) noexcept {
    if (offset > size) return false;
    return ::pread(descriptor, bytes.data(), count, static_cast<off_t>(offset)) == static_cast<ssize_t>(count);
  }

  /// `promised` bytes of sound from `start` on, which lies inside the file.
  Missing missing(std::uint64_t start, std::uint64_t promised) const noexcept {
    const std::uint64_t there = size > start ? size - start : 0;
    return promised > there ? Missing(promised - there) : std::nullopt;
  }
};

Missing missing_in_wav(File& file) noexcept {
  std::uint64_t long_size = 0;  // from ds64 (EBU Tech 3306), which comes first in an RF64 file
  std::uint64_t offset = 12;
  for (int chunk = 0; chunk < kMostChunks && file.read(offset, 8); ++chunk) {
    std::uint64_t size = little_endian(file.bytes.data() + 4, 4);
    if (is_tag(file.bytes, 0, "data")) {
      if (size == kOpen32) size = long_size;
      if (size == 0 || size == kOpen64) return std::nullopt;
      return file.missing(offset + 8, size);
    }
    if (is_tag(file.bytes, 0, "ds64")) {
      if (!file.read(offset + 8, 16)) return std::nullopt;
      long_size = little_endian(file.bytes.data() + 8, 8);
    }
    offset += 8 + size + (size & 1);  // chunks begin at even offsets
  }
  return std::nullopt;
}

/// Sizes count the 24 bytes of the chunk's own head; chunks begin at multiples of 8.
Missing missing_in_w64(File& file) noexcept {
  std::uint64_t offset = 40;
  for (int chunk = 0; chunk < kMostChunks && file.read(offset, 24); ++chunk) {
    const std::uint64_t size = little_endian(file.bytes.data() + 16, 8);
    if (is_tag(file.bytes, 0, "data") && is_tag(file.bytes, 4, kW64Tail)) {
      if (size <= 24 || size == kOpen64) return std::nullopt;
      return file.missing(offset + 24, size - 24);
    }
    if (size < 24 || size > file.size) return std::nullopt;
    offset += (size + 7) / 8 * 8;
  }
  return std::nullopt;
}

/// The sound chunk begins with two numbers of four bytes, an offset and a block size.
Missing missing_in_aiff(File& file) noexcept {
  std::uint64_t offset = 12;
  for (int chunk = 0; chunk < kMostChunks && file.read(offset, 8); ++chunk) {
    const std::uint64_t size = big_endian(file.bytes.data() + 4, 4);
    if (is_tag(file.bytes, 0, "SSND")) {
      if (size <= 8 || size == kOpen32) return std::nullopt;
      return file.missing(offset + 16, size - 8);
    }
    offset += 8 + size + (size & 1);
  }
  return std::nullopt;
}

}  // namespace

std::optional<std::uint64_t> missing_sound_bytes(int descriptor) noexcept {
  struct stat about {};
  if (::fstat(descriptor, &about) != 0) return std::nullopt;
  File file{descriptor, static_cast<std::uint64_t>(about.st_size)};
  if (!file.read(0, 12)) return std::nullopt;
  const bool riff = is_tag(file.bytes, 0, "RIFF") || is_tag(file.bytes, 0, "RF64");
  if (riff && is_tag(file.bytes, 8, "WAVE")) return missing_in_wav(file);
  if (is_tag(file.bytes, 0, "FORM") && is_tag(file.bytes, 8, "AIF")) return missing_in_aiff(file);
  if (file.read(0, 40) && is_tag(file.bytes, 0, kW64First)) return missing_in_w64(file);
  return std::nullopt;
}

}  // namespace unsoldered
