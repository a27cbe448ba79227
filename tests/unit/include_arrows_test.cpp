// Reads every #include of ours and fails on a folder that may not be used from there.
#include <boost/test/unit_test.hpp>
#include <filesystem>
#include <fstream>
#include <map>
#include <regex>
#include <set>
#include <string>

BOOST_AUTO_TEST_SUITE(include_arrows)

namespace {

namespace fs = std::filesystem;
using Folders = std::set<std::string>;

const std::map<std::string, Folders>& arrows() {
  static const Folders engine{"engine/network", "engine/sequence", "engine/sparse",     "engine/fault",
                              "engine/phase",   "engine/standard", "engine/protection", "engine/study"};
  static const auto with = [](Folders base, std::initializer_list<std::string> more) {
    base.insert(more);
    return base;
  };
  static const std::map<std::string, Folders> allowed{
      {"engine/network", {"engine/network"}},
      {"engine/sparse", {"engine/sparse"}},
      {"engine/sequence", {"engine/sequence", "engine/network"}},
      {"engine/fault", {"engine/fault", "engine/sequence", "engine/sparse", "engine/network"}},
      {"engine/phase", {"engine/phase", "engine/network"}},
      {"engine/standard",
       {"engine/standard", "engine/network", "engine/sequence", "engine/fault", "engine/sparse"}},
      {"engine/protection",
       {"engine/protection", "engine/fault", "engine/sequence", "engine/sparse", "engine/network"}},
      {"engine/study", engine},
      {"reports", with(engine, {"reports"})},
      {"io/case_file", with(engine, {"io/case_file"})},
      {"io/command_line", with(engine, {"reports", "io/case_file", "io/command_line"})},
  };
  return allowed;
}

// "engine/network" of engine/network/bus.hpp; "reports" of reports/text.hpp.
std::string folder_of(const std::string& path) {
  const auto first = path.find('/');
  if (path.rfind("reports/", 0) == 0) return "reports";
  return path.substr(0, path.find('/', first + 1));
}

std::vector<std::string> own_includes(const fs::path& file) {
  static const std::regex pattern(R"re(^\s*#\s*include\s*["<]((engine|io|reports|tests)/[^">]+)[">])re");
  std::vector<std::string> found;
  std::ifstream in(file);
  for (std::string line; std::getline(in, line);) {
    std::smatch match;
    if (std::regex_search(line, match, pattern)) found.push_back(match[1]);
  }
  return found;
}

std::vector<std::string> forbidden(const std::string& path, const std::vector<std::string>& includes) {
  std::vector<std::string> wrong;
  const auto rule = arrows().find(folder_of(path));
  for (const auto& include : includes)
    if (rule == arrows().end() || rule->second.count(folder_of(include)) == 0)
      wrong.push_back(path + " -> " + include);
  return wrong;
}

}  // namespace

BOOST_AUTO_TEST_CASE(every_include_follows_the_table) {
  const fs::path root = KILOAMP_SOURCE_DIR;
  std::size_t files = 0;
  for (const char* top : {"engine", "io", "reports"}) {
    for (const auto& entry : fs::recursive_directory_iterator(root / top)) {
      const auto extension = entry.path().extension();
      if (extension != ".hpp" && extension != ".cpp") continue;
      ++files;
      for (const auto& wrong :
           forbidden(fs::relative(entry.path(), root).string(), own_includes(entry.path())))
        BOOST_ERROR(wrong);
    }
  }
  BOOST_TEST(files > 30);
}

BOOST_AUTO_TEST_CASE(an_upward_include_is_seen) {
  BOOST_TEST(forbidden("engine/network/x.hpp", {"engine/study/study.hpp"}).size() == 1);
  BOOST_TEST(forbidden("engine/phase/x.cpp", {"engine/sequence/circuit.hpp"}).size() == 1);
  BOOST_TEST(forbidden("reports/x.cpp", {"io/case_file/case_reader.hpp"}).size() == 1);
  BOOST_TEST(forbidden("engine/study/x.cpp", {"engine/fault/fault.hpp"}).empty());
}

BOOST_AUTO_TEST_SUITE_END()
