// A file that appears whole or not at all.
#pragma once
#include <cstdio>
#include <string>
#include <string_view>

namespace kiloamp {

/// Writes beside the target and takes its name when committed; destroyed before that, it leaves nothing.
class WholeFile {
 public:
  /// @throws std::runtime_error  in a plain sentence, when the folder cannot be written to or the target is a
  /// directory
  explicit WholeFile(std::string target);
  ~WholeFile();
  WholeFile(const WholeFile&) = delete;
  WholeFile& operator=(const WholeFile&) = delete;

  void write(std::string_view text);  ///< @throws std::runtime_error  the disk is full
  void commit();                      ///< @throws std::runtime_error  the name cannot be taken

 private:
  std::string target_, beside_;
  std::FILE* file_ = nullptr;
};

}  // namespace kiloamp
