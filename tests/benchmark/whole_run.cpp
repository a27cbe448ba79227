// The whole program against what reading its input and writing its output cost by themselves.
//
// usage: whole_run KILOAMP CASE.json OUT.csv     KILOAMP: the program, as a path
// Three rounds, interleaved: the JSON text through nlohmann_json's SAX parser with a receiver that does
// nothing, the program's own run (four faults, contributions, CSV), and its bytes written to a file again.
// Medians, and the peak memory of the program.
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <chrono>
#include <cstdio>
#include <fstream>
#include <iterator>
#include <nlohmann/json.hpp>
#include <string>
#include <vector>

namespace {

using nlohmann::json;

struct Ignore : nlohmann::json_sax<json> {
  bool null() override { return true; }
  bool boolean(bool) override { return true; }
  bool number_integer(json::number_integer_t) override { return true; }
  bool number_unsigned(json::number_unsigned_t) override { return true; }
  bool number_float(json::number_float_t, const std::string&) override { return true; }
  bool string(std::string&) override { return true; }
  bool binary(json::binary_t&) override { return true; }
  bool start_object(std::size_t) override { return true; }
  bool key(std::string&) override { return true; }
  bool end_object() override { return true; }
  bool start_array(std::size_t) override { return true; }
  bool end_array() override { return true; }
  bool parse_error(std::size_t, const std::string&, const json::exception&) override { return false; }
};

std::string content(const char* path) {
  std::string text;
  std::FILE* file = std::fopen(path, "rb");
  if (file == nullptr) return text;
  std::fseek(file, 0, SEEK_END);
  text.resize(static_cast<std::size_t>(std::ftell(file)));
  std::rewind(file);
  text.resize(std::fread(text.data(), 1, text.size(), file));
  std::fclose(file);
  return text;
}

template <typename Work>
double milliseconds(Work&& work) {
  const auto start = std::chrono::steady_clock::now();
  work();
  return std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - start).count();
}

int run(const std::vector<std::string>& words) {
  std::vector<char*> arguments;
  for (const std::string& word : words) arguments.push_back(const_cast<char*>(word.c_str()));
  arguments.push_back(nullptr);
  const pid_t child = ::fork();
  if (child == 0) {
    ::execv(arguments[0], arguments.data());
    std::_Exit(127);
  }
  int status = 0;
  ::waitpid(child, &status, 0);
  return status;
}

double median(std::vector<double> times) {
  std::sort(times.begin(), times.end());
  return times[times.size() / 2];
}

}  // namespace

int main(int argc, char** argv) {
  if (argc != 4) {
    std::fprintf(stderr, "usage: whole_run KILOAMP CASE.json OUT.csv\n");
    return 2;
  }
  std::vector<double> parse, whole, write;
  std::size_t bytes = 0;
  for (int round = 0; round < 3; ++round) {
    parse.push_back(milliseconds([&] {
      const std::string text = content(argv[2]);
      Ignore receiver;
      if (!json::sax_parse(text.begin(), text.end(), &receiver)) std::exit(1);
    }));
    whole.push_back(milliseconds([&] {
      if (run({argv[1], "sweep", argv[2], "--format", "csv", "--table", "contributions", "--output", argv[3],
               "--timing"}) != 0)
        std::exit(1);
    }));
    const std::string text = content(argv[3]);
    bytes = text.size();
    const std::string copy = std::string(argv[3]) + ".copy";
    write.push_back(milliseconds([&] {
      std::FILE* file = std::fopen(copy.c_str(), "wb");
      if (file == nullptr || std::fwrite(text.data(), 1, text.size(), file) != text.size()) std::exit(1);
      std::fclose(file);
    }));
    std::remove(copy.c_str());
  }
  rusage used{};
  ::getrusage(RUSAGE_CHILDREN, &used);
  const double floor = median(parse) + median(write);
  std::printf("SAX parsing %.0f ms, writing %.1f MB %.0f ms, whole program %.0f ms: %.2f times the two\n",
              median(parse), static_cast<double>(bytes) / 1e6, median(write), median(whole),
              median(whole) / floor);
  std::printf("peak memory of the program %.0f MB\n", static_cast<double>(used.ru_maxrss) / 1024);
  return 0;
}
