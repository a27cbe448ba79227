// Reading, refusing and writing of case files.
#include "io/case_file/case_reader.hpp"

#include <sys/stat.h>
#include <unistd.h>

#include <boost/test/unit_test.hpp>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <nlohmann/json.hpp>

#include "io/case_file/case_writer.hpp"
#include "io/case_file/schema.hpp"
#include "io/case_file/sha256.hpp"

using namespace kiloamp;
namespace fs = std::filesystem;

BOOST_AUTO_TEST_SUITE(case_file)

namespace {

const fs::path kRoot = KILOAMP_SOURCE_DIR;

std::string bytes(const fs::path& path) {
  std::ifstream in(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(in), {}};
}

std::vector<fs::path> files(const fs::path& folder, const std::string& extension) {
  std::vector<fs::path> found;
  for (const auto& entry : fs::directory_iterator(folder))
    if (entry.path().extension() == extension) found.push_back(entry.path());
  std::sort(found.begin(), found.end());
  return found;
}

}  // namespace

BOOST_AUTO_TEST_CASE(every_case_is_read_and_written_again_as_it_was) {
  std::size_t count = 0;
  for (const fs::path& folder : {kRoot / "cases", kRoot / "tests/published/cases"}) {
    for (const auto& file : files(folder, ".json")) {
      BOOST_TEST_CONTEXT(file.string()) {
        const ReadResult read = read_case(file);
        BOOST_TEST(render(read.errors) == "");
        BOOST_REQUIRE(read.network.has_value());
        BOOST_TEST((nlohmann::json::parse(bytes(file)) == nlohmann::json::parse(write_case(*read.network))));
        ++count;
      }
    }
  }
  BOOST_TEST(count >= 10);
}

BOOST_AUTO_TEST_CASE(user_fields_are_kept) {
  const std::string text =
      R"({"format":"kiloamp-case","version":1,"frequency_hz":50,"x_owner":{"name":"A","rev":[1,2.5,null,true]},
    "buses":[{"id":"B","nominal_kv":11,"x_tag":"s/\u00e4\"q\"","in_service":true,"note":"n"}]})";
  const ReadResult read = read_case_text(text, "text");
  BOOST_TEST(render(read.errors) == "");
  BOOST_REQUIRE(read.network.has_value());
  BOOST_TEST((nlohmann::json::parse(text) == nlohmann::json::parse(write_case(*read.network))));
}

// Each bad file stands beside the text that a user sees, byte for byte.
BOOST_AUTO_TEST_CASE(every_bad_file_is_refused_with_its_text) {
  std::size_t count = 0;
  for (const auto& file : files(kRoot / "tests/must_fail", ".json")) {
    BOOST_TEST_CONTEXT(file.string()) {
      const ReadResult read = read_case_text(bytes(file), file.filename().string());
      BOOST_TEST(!read.network.has_value());
      BOOST_TEST(render(read.errors) == bytes(fs::path(file).replace_extension(".expected.txt")));
      ++count;
    }
  }
  BOOST_TEST(count >= 60);
}

BOOST_AUTO_TEST_CASE(faults_of_the_file_system_are_told_apart) {
  const fs::path folder = fs::temp_directory_path() / ("kiloamp-test-" + std::to_string(::getpid()));
  fs::create_directories(folder);
  BOOST_TEST(render(read_case(folder).errors) ==
             folder.string() +
                 ": is a directory\n  must be a file\n  remedy: name the case file inside it\n");
  const fs::path missing = folder / "missing.json";
  BOOST_TEST(render(read_case(missing).errors) ==
             missing.string() +
                 ": no such file\n  must be a case file or - for standard input\n  remedy: check the path\n");
  if (::geteuid() != 0) {  // root reads everything
    const fs::path closed = folder / "closed.json";
    std::ofstream(closed) << "{}";
    ::chmod(closed.c_str(), 0);
    BOOST_TEST(
        render(read_case(closed).errors) ==
        closed.string() +
            ": cannot be read: Permission denied\n  must be readable\n  remedy: check its permissions\n");
  }
  fs::remove_all(folder);
}

// No cut and no changed byte crashes or hangs the reader; it reads or it complains.
BOOST_AUTO_TEST_CASE(cut_or_changed_files_are_read_or_refused) {
  const std::string whole = bytes(kRoot / "tests/published/cases/coupled_pair.json");
  BOOST_REQUIRE(read_case_text(whole, "whole").network.has_value());
  for (std::size_t length = 0; length < whole.size(); ++length) {
    const ReadResult read = read_case_text(whole.substr(0, length), "cut");
    BOOST_TEST(read.network.has_value() == (length + 1 >= whole.size()));  // the last byte is a line end
    BOOST_TEST(read.network.has_value() != !read.errors.empty());
  }
  std::uint32_t random = 12345;
  for (int round = 0; round < 4000; ++round) {
    random = random * 1664525U + 1013904223U;
    std::string changed = whole;
    changed[(random >> 8) % changed.size()] = static_cast<char>(random >> 24);
    const ReadResult read = read_case_text(changed, "changed");
    BOOST_TEST(read.network.has_value() == read.errors.empty());
  }
}

BOOST_AUTO_TEST_CASE(ten_thousand_errors_are_counted_and_not_all_shown) {
  std::string text = R"({"format":"kiloamp-case","version":1,"frequency_hz":50,"buses":[)";
  for (int i = 0; i < 10000; ++i)
    text += (i > 0 ? ",{\"id\":\"" : "{\"id\":\"") + std::to_string(i) + "\",\"nominal_kv\":-1}";
  const ReadResult read = read_case_text(text + "]}", "many");
  BOOST_TEST(read.errors.size() == 10000U);
  const std::string shown = render(read.errors);
  BOOST_TEST(std::count(shown.begin(), shown.end(), '\n') == 301);
  BOOST_TEST(shown.find("... and 9900 more\n") != std::string::npos);
}

BOOST_AUTO_TEST_CASE(shipped_schema_is_the_one_that_the_reader_follows) {
  BOOST_TEST(bytes(kRoot / "io/schema/case.schema.json") == case_schema());
}

// FIPS 180-4, examples of the standard: "abc", the empty text, and the 448-bit text.
BOOST_AUTO_TEST_CASE(sha256_matches_fips_180_4) {
  BOOST_TEST(sha256("abc") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  BOOST_TEST(sha256("") == "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
  BOOST_TEST(sha256("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq") ==
             "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
}

BOOST_AUTO_TEST_SUITE_END()
