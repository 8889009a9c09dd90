// Puts a set of files into a folder all together or not at all.
//
// Files are written under temporary names in the folder and renamed when all are complete. What is left at destruction
// is removed, and so are the folders made here when nothing was published.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace unsoldered {

class ClipFolder {
 public:
  /// `names` in the order of publishing. Looks only: refuses a target that exists (unless `force`), one that is a
  /// folder, one that is the same file as an input (always), two of one name, and a `folder` that is a file.
  /// Throws InputError.
  ClipFolder(std::filesystem::path folder, std::vector<std::string> names, bool force,
             const std::vector<std::filesystem::path>& inputs);
  ClipFolder(const ClipFolder&) = delete;
  ClipFolder& operator=(const ClipFolder&) = delete;
  ~ClipFolder();

  /// Makes the folder and its parents where missing. Throws CannotError.
  void create();

  /// Where to write file `index` until it is published. Any thread.
  std::filesystem::path temporary(std::size_t index) const;

  /// Removes file `index` again, to write it anew.
  void discard(std::size_t index) const noexcept;

  /// Writes a whole small file under its temporary name. Throws CannotError.
  void write(std::size_t index, const std::string& text) const;

  /// Gives all files their names. Without `force` never replaces a file, not even one that appeared since the check;
  /// takes back what was published when one cannot be. Throws InputError or CannotError.
  void publish();

 private:
  void check(const std::vector<std::filesystem::path>& inputs) const;
  void publish(std::size_t index) const;

  std::filesystem::path folder_;
  std::vector<std::string> names_;
  bool force_;
  std::string token_;  // makes temporary names unlike those of any other call, also of one that was killed
  std::vector<std::filesystem::path> created_;  // folders, outermost first
  bool published_ = false;
};

}  // namespace unsoldered
