#include "io/command_line/whole_file.hpp"

#include <unistd.h>

#include <cerrno>
#include <cstring>
#include <filesystem>
#include <stdexcept>

namespace kiloamp {

namespace {
[[noreturn]] void fail(const std::string& target) {
  throw std::runtime_error(target + " cannot be written: " + std::strerror(errno));
}
}  // namespace

WholeFile::WholeFile(std::string target)
    : target_(std::move(target)), beside_(target_ + "." + std::to_string(::getpid()) + ".part") {
  std::error_code ignored;
  if (std::filesystem::is_directory(target_, ignored))
    throw std::runtime_error(target_ + " cannot be written: it is a directory");
  file_ = std::fopen(beside_.c_str(), "wb");
  if (file_ == nullptr) fail(target_);
}

WholeFile::~WholeFile() {
  if (file_ != nullptr) std::fclose(file_);
  std::error_code ignored;
  if (!beside_.empty()) std::filesystem::remove(beside_, ignored);
}

void WholeFile::write(std::string_view text) {
  if (std::fwrite(text.data(), 1, text.size(), file_) != text.size()) fail(target_);
}

void WholeFile::commit() {
  const int closed = std::fclose(file_);
  file_ = nullptr;
  if (closed != 0) fail(target_);
  std::error_code error;
  std::filesystem::rename(beside_, target_, error);
  if (error) throw std::runtime_error(target_ + " cannot be written: " + error.message());
  beside_.clear();
}

}  // namespace kiloamp
