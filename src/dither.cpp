#include "src/dither.h"

namespace unsoldered {

std::uint64_t dither_seed(std::string_view name) noexcept {
  std::uint64_t hash = 0xcbf29ce484222325u;
  for (const char letter : name) {
    hash ^= static_cast<unsigned char>(letter);
    hash *= 0x100000001b3u;
  }
  return hash;
}

}  // namespace unsoldered
