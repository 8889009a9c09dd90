#include "src/take.h"

#include <filesystem>

#include "src/built_in_take.h"
#include "src/sound_file.h"

namespace unsoldered {

std::unique_ptr<Take> open_take(const std::string& name) {
  if (name == kBuiltInTake) return std::make_unique<BuiltInTake>();
  return std::make_unique<SoundFileTake>(name);
}

std::string take_stem(const std::string& name) {
  if (name == kBuiltInTake) return name;
  return std::filesystem::path(name).stem().string();
}

}  // namespace unsoldered
