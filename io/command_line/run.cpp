#include "io/command_line/run.hpp"

#include <algorithm>
#include <csignal>
#include <new>
#include <ostream>

#include "engine/study/cross_check.hpp"
#include "io/case_file/case_reader.hpp"
#include "io/command_line/options.hpp"
#include "io/command_line/whole_file.hpp"
#include "reports/check_report.hpp"
#include "reports/fault_report.hpp"

namespace kiloamp {

namespace {

// Where the report goes: standard output, or a file that appears when all is written.
class Output {
 public:
  Output(const std::optional<std::string>& path, std::ostream& out) : out_(out) {
    if (path) file_.emplace(*path);
  }
  Sink sink() {
    return [this](std::string_view text) {
      if (file_) {
        file_->write(text);
        return;
      }
      out_.write(text.data(), static_cast<std::streamsize>(text.size()));
      if (!out_) throw std::runtime_error("standard output cannot be written");
    };
  }
  void commit() {
    if (file_)
      file_->commit();
    else if (!out_.flush())
      throw std::runtime_error("standard output cannot be written");
  }

 private:
  std::ostream& out_;
  std::optional<WholeFile> file_;
};

// Ids of the command line that the case does not have, all of them.
bool resolve(Command& c, const Network& network, std::ostream& err) {
  std::vector<std::string_view> buses, scenarios;
  for (const Bus& b : network.buses) buses.push_back(b.id);
  for (const Scenario& s : network.scenarios) scenarios.push_back(s.id);
  bool good = true;
  const auto index = [&](const std::string& id, const std::vector<std::string_view>& known,
                         const char* option, const char* what) -> std::optional<std::size_t> {
    const auto found = std::find(known.begin(), known.end(), id);
    if (found != known.end()) return static_cast<std::size_t>(found - known.begin());
    const std::string near = nearest(id, known);
    err << "kiloamp: " << option << " \"" << id << "\" is not " << what << " of this case"
        << (near.empty() ? "" : "; did you mean \"" + near + "\"?") << "\n";
    good = false;
    return std::nullopt;
  };
  for (const auto& id : c.buses)
    if (const auto bus = index(id, buses, "--bus", "a bus"))
      c.study.buses.push_back(static_cast<BusIndex>(*bus));
  if (c.scenario) c.study.scenario = index(*c.scenario, scenarios, "--scenario", "a scenario");
  return good;
}

std::unique_ptr<FaultReport> make_report(const Command& c, const Study& study, const ReportFacts& facts,
                                         Sink sink) {
  if (c.format == "csv")
    return csv_report(study, c.table == "faults" ? CsvTable::faults : CsvTable::contributions,
                      std::move(sink));
  if (c.format == "json") return json_report(study, facts, std::move(sink));
  return text_report(study, facts, std::move(sink));
}

int run_faults(const Command& c, const Study& study, const ReadResult& read, std::ostream& out,
               std::ostream& err) {
  const ReportFacts facts{c.verb,          c.case_file == "-" ? "standard input" : c.case_file,
                          read.sha256,     read.remarks.size(),
                          c.contributions, c.verb == "fault" || c.study.fault.depth > 0};
  Output output(c.output, out);
  const auto report = make_report(c, study, facts, output.sink());
  std::optional<CrossCheck> check;
  if (c.cross_check) check = cross_check(study);
  report->begin();
  study.for_each_fault([&](const FaultResult& result) { report->fault(result); });
  report->end(check ? &*check : nullptr);
  output.commit();
  if (!check) return kRan;
  if (c.format == "csv")
    err << "cross-check in phase coordinates: " << check->faults << " faults, largest relative difference "
        << check->largest << "\n";
  if (check->largest <= kCrossCheckLimit) return kRan;
  err << "kiloamp: the cross-check disagrees: " << check->largest << " in the " << check->quantity
      << " of a fault at " << study.network().bus(check->bus).id << "\n";
  return kNotComputed;
}

// Which buses a row of a sequence network stands for.
std::string place_of(const Network& network, const StudyOptions& options,
                     const sparse::NumericalError& error) {
  Network state = network;
  if (options.scenario) apply_scenario(state, *options.scenario);
  (void)fill_defaults(state);
  const SequenceModel model = build_sequence_model(state, {options.include_shunts, {}});
  static constexpr const char* kNames[] = {"zero", "positive", "negative"};
  std::string text = std::string(kNames[error.lane()]) + " sequence, near bus ";
  const auto buses = model.buses_of(static_cast<Node>(error.row()));
  for (std::size_t i = 0; i < buses.size() && i < 3; ++i)
    text += (i > 0 ? ", " : "") + network.bus(buses[i]).id;
  return text;
}

int run_command(Command c, std::ostream& out, std::ostream& err) {
  ReadResult read = read_case(c.case_file);
  if (!read.network) {
    err << render(read.errors);
    return kInputWrong;
  }
  if (!resolve(c, *read.network, err)) return kInputWrong;
  try {
    const Study study(*read.network, c.study);
    if (c.verb != "check") return run_faults(c, study, read, out, err);
    Output output(c.output, out);
    std::string text = check_text(study, c.case_file == "-" ? "standard input" : c.case_file);
    if (!read.remarks.empty()) text += "\nOutside the usual range, to be confirmed:\n" + render(read.remarks);
    output.sink()(text);
    output.commit();
    return kRan;
  } catch (const NetworkError& error) {
    for (const Finding& finding : error.findings())
      err << render(located(c.case_file, *read.network, finding));
    return kInputWrong;
  } catch (const sparse::NumericalError& error) {
    err << "kiloamp: not computed: " << error.what() << " (" << place_of(*read.network, c.study, error)
        << ")\n";
    return kNotComputed;
  }
}

}  // namespace

int run(std::vector<std::string> arguments, std::ostream& out, std::ostream& err) {
  std::signal(SIGPIPE, SIG_IGN);  // a reader that went away shows as a failed write
  Parsed parsed = parse(std::move(arguments), out, err);
  if (!parsed.command) return parsed.exit_code;
  try {
    return run_command(std::move(*parsed.command), out, err);
  } catch (const std::bad_alloc&) {
    err << "kiloamp: not computed: the memory does not suffice\n";
  } catch (const std::exception& error) {
    err << "kiloamp: not computed: " << error.what() << "\n";
  }
  return kNotComputed;
}

}  // namespace kiloamp
