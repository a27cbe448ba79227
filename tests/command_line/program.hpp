// The program called from a test, and what it wrote.
#pragma once
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <iterator>
#include <sstream>
#include <string>
#include <vector>

#include "io/command_line/run.hpp"

namespace kiloamp::test {

namespace fs = std::filesystem;

struct Outcome {
  int code;
  std::string out, err;
};
inline Outcome kiloamp_run(std::vector<std::string> arguments) {
  std::ostringstream out, err;
  const int code = run(std::move(arguments), out, err);
  return {code, out.str(), err.str()};
}
inline std::string case_file(const std::string& name) {
  return std::string(KILOAMP_SOURCE_DIR) + "/cases/" + name + ".json";
}
inline std::vector<std::string> lines(const std::string& text) {
  std::vector<std::string> all;
  std::istringstream in(text);
  for (std::string line; std::getline(in, line);) all.push_back(line);
  return all;
}
inline std::string slurp(const fs::path& path) {
  std::ifstream in(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(in), {}};
}
struct Folder {
  fs::path path = fs::temp_directory_path() / ("kiloamp-run-" + std::to_string(::getpid()));
  Folder() { fs::create_directories(path); }
  ~Folder() { fs::remove_all(path); }
};

}  // namespace kiloamp::test
