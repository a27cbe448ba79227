#include "io/command_line/run.hpp"

#include <unistd.h>

#include <algorithm>
#include <chrono>
#include <cmath>
#include <csignal>
#include <new>
#include <ostream>

#include "engine/study/cross_check.hpp"
#include "engine/study/ordered_pieces.hpp"
#include "io/case_file/case_reader.hpp"
#include "io/command_line/options.hpp"
#include "io/command_line/whole_file.hpp"
#include "reports/check_report.hpp"
#include "reports/duty_report.hpp"
#include "reports/fault_report.hpp"
#include "reports/outage_report.hpp"
#include "reports/relay_report.hpp"

namespace kiloamp {

namespace {

constexpr std::size_t kBusesInPiece = 256;

// What each stage took, for --timing.
class Stages {
 public:
  /// Ends the stage that is running and names it.
  void next(const char* name) {
    const auto now = std::chrono::steady_clock::now();
    done_.emplace_back(name, std::chrono::duration<double, std::milli>(now - start_).count());
    start_ = now;
  }
  /// Moves part of the stage just ended to a stage of its own, before it.
  void apart(const char* name, double ms) {
    done_.back().second -= ms;
    done_.insert(done_.end() - 1, {name, ms});
  }
  void print(std::ostream& err) const {
    err << "timing [ms]:";
    double sum = 0;
    for (const auto& [name, ms] : done_) {
      err << ' ' << name << ' ' << std::llround(ms) << ',';
      sum += ms;
    }
    err << " together " << std::llround(sum) << '\n';
  }

 private:
  std::chrono::steady_clock::time_point start_ = std::chrono::steady_clock::now();
  std::vector<std::pair<const char*, double>> done_;
};

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

std::unique_ptr<FaultReport> make_report(const Command& c, const Studies& studies, const ReportFacts& facts,
                                         Sink sink) {
  if (c.format == "csv")
    return csv_report(studies, c.table == "faults" ? CsvTable::faults : CsvTable::contributions,
                      std::move(sink));
  if (c.format == "json") return json_report(studies, facts, std::move(sink));
  return text_report(studies, facts, std::move(sink));
}

ReportFacts facts_of(const Command& c, const ReadResult& read) {
  return {c.verb,
          c.case_file == "-" ? "standard input" : c.case_file,
          c.format == "csv" ? std::string() : read.sha256.get(),
          read.remarks.size(),
          c.contributions,
          c.verb == "fault" || c.study.fault.depth > 0,
          c.verb != "outages",
          c.intermediate};
}

int run_outages(const Command& c, const Study& study, const ReadResult& read, Stages& stages,
                std::ostream& out, std::ostream& err) {
  OutageOptions options = c.outages;
  if (options.zone && std::none_of(study.network().buses.begin(), study.network().buses.end(),
                                   [&](const Bus& b) { return b.zone == options.zone; })) {
    err << "kiloamp: --area \"" << *options.zone << "\" is not a zone of this case\n";
    return kInputWrong;
  }
  if (::isatty(STDERR_FILENO) != 0)
    options.progress = [&err](std::size_t done, std::size_t all) {
      err << "\routages: " << done << " of " << all << (done == all ? "\n" : "") << std::flush;
    };
  Output output(c.output, out);
  const OutageTable table = single_outages(study, options);
  stages.next("outages");
  const OutageFormat format = c.format == "csv"    ? OutageFormat::csv
                              : c.format == "json" ? OutageFormat::json
                                                   : OutageFormat::text;
  write_outages(study, table, facts_of(c, read), format, output.sink());
  output.commit();
  return kRan;
}

int run_duty(const Command& c, const ReadResult& read, Stages& stages, std::ostream& out, std::ostream& err) {
  DutyOptions options = c.duty;
  options.study = c.study;
  options.scenario = c.study.scenario;
  if (options.outages && ::isatty(STDERR_FILENO) != 0)
    options.progress = [&err](std::size_t done, std::size_t all) {
      err << "\rstates: " << done << " of " << all << (done == all ? "\n" : "") << std::flush;
    };
  Output output(c.output, out);
  const DutyTable table = duty(*read.network, options);
  stages.next("duty");
  const DutyFormat format = c.format == "csv"    ? DutyFormat::csv
                            : c.format == "json" ? DutyFormat::json
                                                 : DutyFormat::text;
  write_duty(*read.network, table, options, facts_of(c, read), format, output.sink());
  output.commit();
  stages.next("writing");
  if (c.timing) stages.print(err);
  const auto count = [&](Verdict v) { return table.count[static_cast<std::size_t>(v)]; };
  return c.strict && count(Verdict::over) + count(Verdict::not_evaluated) > 0 ? kDutyNotProven : kRan;
}

int run_relays(const Command& c, const ReadResult& read, Stages& stages, std::ostream& out,
               std::ostream& err) {
  RelayOptions options = c.relays;
  options.study = c.study;
  Output output(c.output, out);
  const RelayStudy study(*read.network, options);
  stages.next("solution");
  const RelayReport report(study, facts_of(c, read),
                           c.format == "csv"    ? RelayFormat::csv
                           : c.format == "json" ? RelayFormat::json
                                                : RelayFormat::text);
  struct Thread {
    std::shared_ptr<RelayStudy::Workspace> workspace;
    std::vector<RelayRow> rows;
    std::string text;
  };
  const int count = std::max(1, c.study.threads);
  std::vector<Thread> threads(static_cast<std::size_t>(count));
  for (Thread& thread : threads) thread.workspace = study.make_workspace();
  const Sink sink = output.sink();
  sink(report.begin());
  constexpr std::size_t kLocationsInPiece = 8;
  const std::size_t locations = study.locations().list.size();
  const bool watched = ::isatty(STDERR_FILENO) != 0 && c.relays.everywhere;
  std::size_t done = 0;
  in_ordered_pieces(
      locations, kLocationsInPiece, count,
      [&](int t, std::size_t first, std::size_t last) {
        Thread& own = threads[static_cast<std::size_t>(t)];
        for (std::size_t l = first; l < last; ++l) {
          study.at_location(l, *own.workspace, own.rows);
          own.text += report.location(l, own.rows);
        }
      },
      [&](int t) {
        std::string& text = threads[static_cast<std::size_t>(t)].text;
        sink(text);
        text.clear();
        done = std::min(locations, done + kLocationsInPiece);
        if (watched)
          err << "\rlocations: " << done << " of " << locations << (done == locations ? "\n" : "")
              << std::flush;
      });
  sink(report.end());
  output.commit();
  stages.next("relays and writing");
  if (c.timing) stages.print(err);
  return kRan;
}

// Solves and writes on the studies' threads. With `timing`, returns the part of the wall time that the
// formulas took: that of the threads' own time.
double write_faults(const Studies& studies, FaultReport& report, bool timing) {
  using Clock = std::chrono::steady_clock;
  struct Thread {
    std::vector<FaultLoop> loops;  // one per study
    std::unique_ptr<ReportPiece> piece;
    Clock::duration formulas{}, writing{};
  };
  const int count = std::max(1, studies.front()->options().threads);
  std::vector<Thread> threads(static_cast<std::size_t>(count));
  for (Thread& thread : threads) {
    for (const Study* study : studies) thread.loops.emplace_back(*study);
    thread.piece = report.make_piece();
  }
  const auto& buses = studies.front()->wanted_buses();
  const auto start = Clock::now();
  in_ordered_pieces(
      buses.size(), kBusesInPiece, count,
      [&](int t, std::size_t first, std::size_t last) {
        Thread& own = threads[static_cast<std::size_t>(t)];
        auto since = Clock::now();
        const auto lap = [&](Clock::duration& sum) {
          const auto now = timing ? Clock::now() : since;
          sum += now - since;
          since = now;
        };
        for (std::size_t b = first; b < last; ++b)
          for (FaultLoop& loop : own.loops)
            loop.at_bus(buses[b], [&](const StudiedFault& fault) {
              lap(own.formulas);
              own.piece->fault(fault);
              lap(own.writing);
            });
      },
      [&](int t) {
        Thread& own = threads[static_cast<std::size_t>(t)];
        const auto since = Clock::now();
        report.add(*own.piece);
        own.writing += Clock::now() - since;
      });
  Clock::duration formulas{}, all{};
  for (const Thread& t : threads) {
    formulas += t.formulas;
    all += t.formulas + t.writing;
  }
  if (!timing || all.count() == 0) return 0;
  return std::chrono::duration<double, std::milli>(Clock::now() - start).count() *
         static_cast<double>(formulas.count()) / static_cast<double>(all.count());
}

int run_faults(const Command& c, const Studies& studies, const ReadResult& read, Stages& stages,
               double& formulas_ms, std::ostream& out, std::ostream& err) {
  const ReportFacts facts = facts_of(c, read);
  Output output(c.output, out);
  const auto report = make_report(c, studies, facts, output.sink());
  std::optional<CrossCheck> check;
  if (c.cross_check) {
    for (const Study* study : studies) {
      CrossCheck one = cross_check(*study);
      const std::size_t before = check ? check->faults : 0;
      if (!check || one.largest > check->largest) check = one;
      check->faults = before + one.faults;
    }
    stages.next("cross-check");
  }
  report->begin();
  formulas_ms = write_faults(studies, *report, c.timing);
  report->end(check ? &*check : nullptr);
  output.commit();
  if (!check) return kRan;
  if (c.format == "csv")
    err << "cross-check in phase coordinates: " << check->faults << " faults, largest relative difference "
        << check->largest << "\n";
  if (check->largest <= kCrossCheckLimit) return kRan;
  err << "kiloamp: the cross-check disagrees: " << check->largest << " in the " << check->quantity
      << " of a fault at " << studies.front()->network().bus(check->bus).id << "\n";
  return kNotComputed;
}

// Which buses a row of a sequence network stands for.
std::string place_of(Network state, const StudyOptions& options, const sparse::NumericalError& error) {
  (void)fill_defaults(state);  // they may be missing where the first of two studies failed
  const SequenceModel model = build_sequence_model(state, {options.include_shunts});
  static constexpr const char* kNames[] = {"zero", "positive", "negative"};
  std::string text = std::string(kNames[error.lane()]) + " sequence, near bus ";
  const auto buses = model.buses_of(static_cast<Node>(error.row()));
  for (std::size_t i = 0; i < buses.size() && i < 3; ++i)
    text += (i > 0 ? ", " : "") + state.bus(buses[i]).id;
  return text;
}

int run_command(Command c, std::ostream& out, std::ostream& err) {
  Stages stages;
  ReadResult read = read_case(c.case_file);
  stages.next("reading");
  if (!read.network) {
    err << render(read.errors);
    return kInputWrong;
  }
  if (!resolve(c, *read.network, err)) return kInputWrong;
  std::optional<Study> made, smallest;
  try {
    if (c.verb == "duty") return run_duty(c, read, stages, out, err);
    if (c.verb == "relays") return run_relays(c, read, stages, out, err);
    if (c.both_kinds) {
      StudyOptions options = c.study;
      options.case_kind = CaseKind::min;
      smallest.emplace(Network(*read.network), options);
    }
    const Study& study = made.emplace(std::move(*read.network), c.study);
    Studies studies{&study};
    if (smallest) studies.push_back(&*smallest);
    stages.next("notes");
    stages.apart("model", study.timing().model_ms);
    stages.apart("solution", study.timing().solution_ms);
    if (c.verb != "check") {
      double formulas_ms = 0;
      const int code = c.verb == "outages" ? run_outages(c, study, read, stages, out, err)
                                           : run_faults(c, studies, read, stages, formulas_ms, out, err);
      stages.next("writing");
      if (formulas_ms > 0) stages.apart("fault formulas", formulas_ms);
      if (c.timing) stages.print(err);
      return code;
    }
    Output output(c.output, out);
    std::string text = check_text(study, c.case_file == "-" ? "standard input" : c.case_file);
    if (!read.remarks.empty()) text += "\nOutside the usual range, to be confirmed:\n" + render(read.remarks);
    output.sink()(text);
    output.commit();
    return kRan;
  } catch (const NetworkError& error) {
    std::vector<InputError> errors;
    for (const Finding& finding : error.findings())
      errors.push_back(located(c.case_file, *read.network, finding));
    err << render(errors);
    return kInputWrong;
  } catch (const sparse::NumericalError& error) {
    err << "kiloamp: not computed: " << error.what() << " ("
        << place_of(made ? made->network() : *read.network, c.study, error) << ")\n";
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
