#include "src/inside_folder.h"

#include <algorithm>
#include <system_error>

namespace unsoldered {

bool leads_out_of(const std::filesystem::path& folder, const std::filesystem::path& file) {
  const auto leaves = [](const std::filesystem::path& path) {
    return path.is_absolute() || std::find(path.begin(), path.end(), "..") != path.end();
  };
  if (leaves(file.lexically_normal())) return true;
  const std::filesystem::path home = folder.empty() ? std::filesystem::path(".") : folder;
  std::error_code home_error;
  std::error_code file_error;
  const std::filesystem::path real_home = std::filesystem::weakly_canonical(home, home_error);
  const std::filesystem::path real_file = std::filesystem::weakly_canonical(home / file, file_error);
  return home_error || file_error || leaves(real_file.lexically_relative(real_home));
}

}  // namespace unsoldered
