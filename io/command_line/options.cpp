#include "io/command_line/options.hpp"

#include <CLI/CLI.hpp>
#include <algorithm>
#include <charconv>
#include <ostream>
#include <thread>

#include "io/case_file/case_reader.hpp"
#include "io/command_line/run.hpp"

namespace kiloamp {

namespace {

constexpr const char* kVersion = "kiloamp 0.1.0";
constexpr const char* kOverview =
    "Short-circuit currents of a three-phase network: largest and smallest, at every bus, with "
    "contributions.\n\n"
    "  kiloamp check CASE            read a case and judge its data\n"
    "  kiloamp sweep CASE            faults at every bus\n"
    "  kiloamp fault CASE --bus ID   faults at one bus, with currents and voltages around it\n"
    "  kiloamp outages CASE          largest and smallest current at every bus over all single outages\n"
    "  kiloamp relays CASE           currents and voltages that each relay sees, over faults and states\n"
    "  kiloamp duty CASE             breakers, fuses and switchboards against what the network asks of "
    "them\n\n"
    "kiloamp VERB --help explains a verb. CASE is a case file, or - for standard input.\n"
    "Exit codes: 0 the study ran; 1 it could not be computed, or a cross-check disagreed; 2 the input is "
    "wrong; 3 duty --strict found a device over or not evaluated.";

const std::vector<std::string_view> kFaultWords{"3ph", "lg", "ll", "llg"};

std::string choices(const std::vector<std::string_view>& words) {
  std::string out;
  for (const auto word : words) out += (out.empty() ? "" : ", ") + std::string(word);
  return out;
}

std::string must_be(const std::string& value, const std::vector<std::string_view>& words) {
  const std::string near = nearest(value, words);
  return "\"" + value + "\" is not one of " + choices(words) +
         (near.empty() ? "" : "; did you mean " + near + "?");
}

// A check for CLI11: the value is one of the words.
CLI::Validator one_of(std::vector<std::string_view> words) {
  return CLI::Validator(
      [words](std::string& value) {
        return std::find(words.begin(), words.end(), value) == words.end() ? must_be(value, words)
                                                                           : std::string();
      },
      "");
}

bool read_number(std::string_view text, double& value) {
  const auto end = text.data() + text.size();
  const auto result = std::from_chars(text.data(), end, value);
  return result.ec == std::errc() && result.ptr == end && std::isfinite(value);
}

// "R,X" in ohm.
std::string read_impedance(const std::string& text, Complex& z) {
  const auto comma = text.find(',');
  double r = 0, x = 0;
  const bool read = comma != std::string::npos && read_number(std::string_view(text).substr(0, comma), r) &&
                    read_number(std::string_view(text).substr(comma + 1), x);
  if (!read || r < 0) return "\"" + text + "\" is not R,X in ohm with R >= 0, for example 0.5,0";
  z = {r, x};
  return {};
}

std::string read_prefault(const std::string& text, PrefaultChoice& choice) {
  double pu = 0;
  if (text == "case")
    choice = PrefaultAsGiven{};
  else if (text == "flat")
    choice = PrefaultFlat{};
  else if (read_number(text, pu) && pu > 0 && pu <= 2)
    choice = PrefaultValue{pu};
  else
    return "\"" + text + "\" is not case, flat or a voltage in pu up to 2";
  return {};
}

std::string read_kinds(const std::string& text, std::vector<FaultKind>& kinds) {
  kinds.clear();
  std::size_t start = 0;
  while (start <= text.size()) {
    const std::size_t comma = std::min(text.find(',', start), text.size());
    const std::string word = text.substr(start, comma - start);
    const auto found = std::find(kFaultWords.begin(), kFaultWords.end(), word);
    if (found == kFaultWords.end()) return must_be(word, kFaultWords);
    const auto kind = static_cast<FaultKind>(found - kFaultWords.begin());
    if (std::find(kinds.begin(), kinds.end(), kind) == kinds.end()) kinds.push_back(kind);
    start = comma + 1;
  }
  return {};
}

// CLI11 validators double as setters for options with a form of their own.
template <typename Target>
CLI::Validator into(std::string (*read)(const std::string&, Target&), Target& target) {
  return CLI::Validator([read, &target](std::string& text) { return read(text, target); }, "");
}

struct Texts {  // what the custom options were given as
  std::string kinds, prefault, phase, earth, method, edition, kappa, case_kind, elements, small_motors;
  std::optional<double> marginal_percent;
  std::optional<double> tmin_s, duration_s;
  bool one_kind_only = false;  // of the verb whose options are being made
  std::optional<int> depth;
};

// Words of --elements and the kinds they stand for.
struct ElementWord {
  std::string_view word;
  std::vector<ElementKind> kinds;
};
const std::vector<ElementWord>& element_words() {
  static const std::vector<ElementWord> words{
      {"feeders", {ElementKind::network_feeder}},
      {"machines", {ElementKind::synchronous_machine}},
      {"motors", {ElementKind::induction_motor}},
      {"lines", {ElementKind::line}},
      {"transformers", {ElementKind::transformer, ElementKind::three_winding_transformer}},
      {"reactors", {ElementKind::series_reactor}},
      {"couplers", {ElementKind::bus_switch}},
      {"earthing", {ElementKind::earthing_transformer}}};
  return words;
}

std::string read_elements(const std::string& text, std::vector<ElementKind>& kinds) {
  kinds.clear();
  std::vector<std::string_view> known;
  for (const auto& entry : element_words()) known.push_back(entry.word);
  std::size_t start = 0;
  while (start <= text.size()) {
    const std::size_t comma = std::min(text.find(',', start), text.size());
    const std::string word = text.substr(start, comma - start);
    const auto found = std::find(known.begin(), known.end(), word);
    if (found == known.end()) return must_be(word, known);
    const auto& add = element_words()[static_cast<std::size_t>(found - known.begin())].kinds;
    kinds.insert(kinds.end(), add.begin(), add.end());
    start = comma + 1;
  }
  return {};
}

// Case, prefault voltage, method's own options, threads, output.
void add_common_options(CLI::App& app, Command& c, Texts& t, const std::string& of_which = {}) {
  app.add_option("CASE", c.case_file, "case file, or - for standard input")->required();
  app.add_option("--edition", t.edition, "iec60909: edition of the voltage factors, 2016 (default) or 2001")
      ->type_name("YEAR")
      ->check(one_of({"2016", "2001"}));
  app.add_option(
         "--small-motors", t.small_motors,
         "c37: induction motors below 50 hp in the first cycle: in (combined network, default) or out")
      ->type_name("WORD")
      ->check(one_of({"in", "out"}));
  app.add_option(
         "--prefault", t.prefault,
         of_which +
             "prefault voltage: case (as the case gives it, 1 pu where it does not; default), flat (1 "
             "pu), or a number in pu")
      ->type_name("U")
      ->check(into(read_prefault, c.study.prefault));
  app.add_flag("--shunts", c.study.include_shunts,
               of_which + "keep line charging and shunts in positive and negative sequence too");
  app.add_option("--threads", c.study.threads, "threads; results do not depend on it. Default: all cores")
      ->type_name("N")
      ->check(CLI::Range(1, 256));
  app.add_option("--format", c.format, "text (default), csv or json")
      ->type_name("FORMAT")
      ->check(one_of({"text", "csv", "json"}));
  app.add_option("--output", c.output, "write to FILE, whole or not at all. Default: standard output")
      ->type_name("FILE");
  app.add_flag("--timing", c.timing,
               "print on standard error what reading, model building, solving and writing took");
}

// What a study of faults takes besides: state, method, impedances.
void add_study_options(CLI::App& app, Command& c, Texts& t) {
  add_common_options(app, c, t);
  app.add_option("--scenario", c.scenario, "state of the network, by its id in the case. Default: as written")
      ->type_name("ID");
  app.add_option("--case-kind", t.case_kind,
                 "max: largest currents (default); min: feeders at min, hot conductors, motors out" +
                     std::string(t.one_kind_only ? "" : "; both: side by side"))
      ->type_name("KIND")
      ->check(one_of(t.one_kind_only ? std::vector<std::string_view>{"max", "min"}
                                     : std::vector<std::string_view>{"max", "min", "both"}));
  app.add_option("--method", t.method,
                 "classical: voltage behind impedance (default); iec60909: IEC 60909-0; c37: ANSI/IEEE C37")
      ->type_name("METHOD")
      ->check(one_of({"classical", "iec60909", "c37"}));
  app.add_option("--phase-impedance", t.phase,
                 "ohm in each faulted phase, between it and the point where they join. Default: 0,0")
      ->type_name("R,X")
      ->check(into(read_impedance, c.study.phase_ohm));
  app.add_option("--earth-impedance", t.earth, "ohm from that point to earth (lg, llg). Default: 0,0")
      ->type_name("R,X")
      ->check(into(read_impedance, c.study.earth_ohm));
}

void add_iec60909_options(CLI::App& app, Texts& t) {
  app.add_option("--duration", t.duration_s, "iec60909: duration Tk of the fault for Ith, in s. Default: 1")
      ->type_name("S")
      ->check(CLI::Range(1e-6, 100.0));
  app.add_option("--kappa-method", t.kappa,
                 "iec60909: a, b or c (default) of the standard's ways to find kappa")
      ->type_name("LETTER")
      ->check(one_of({"a", "b", "c"}));
}

void add_fault_options(CLI::App& app, Command& c, Texts& t, bool one_place) {
  add_study_options(app, c, t);
  auto* bus = app.add_option("--bus", c.buses,
                             one_place ? "bus of the fault; may be repeated"
                                       : "only this bus; may be repeated. Default: all buses in service");
  bus->type_name("ID")->expected(1)->multi_option_policy(CLI::MultiOptionPolicy::TakeAll);
  if (one_place) bus->required();
  app.add_option("--fault", t.kinds,
                 "kinds of fault, separated by commas: 3ph, lg, ll, llg. Default: all four")
      ->type_name("KINDS")
      ->check(into(read_kinds, c.study.kinds));
  app.add_option(
         "--depth", c.study.fault.depth,
         "voltages, branch currents and neutral currents up to N buses away. Default: 0, the faulted bus")
      ->type_name("N")
      ->check(CLI::Range(0, 1000));
  app.add_option("--tmin", t.tmin_s, "iec60909: minimum time delay for Ib and i_dc, in s. Default: 0.1")
      ->type_name("S")
      ->check(CLI::Range(1e-6, 10.0));
  add_iec60909_options(app, t);
  app.add_flag("--intermediate", c.intermediate,
               "json and iec60909: correction factors, corrected impedances, machines with mu and q");
  app.add_flag(
      "--cross-check", c.cross_check,
      "solve every fault again in phase coordinates and print the largest difference; above 1e-6 exit 1");
  app.add_option("--table", c.table,
                 "csv: faults (default), one row per fault, or contributions, one row per element and fault")
      ->type_name("TABLE")
      ->check(one_of({"faults", "contributions"}));
}

void add_duty_options(CLI::App& app, Command& c, Texts& t) {
  add_common_options(app, c, t, "ANSI/IEEE devices: ");
  app.add_option(
         "--scenario", c.scenario,
         "only this state of the network, by its id in the case. Default: as written and every scenario")
      ->type_name("ID");
  app.add_flag("--outages", c.duty.outages,
               "also each single outage of a feeder, machine, line, transformer (earthing ones too), reactor "
               "or coupler");
  app.add_option(
         "--method", t.method,
         "judge only IEC devices (iec60909) or only ANSI/IEEE devices (c37). Default: both, each by its own")
      ->type_name("METHOD")
      ->check(one_of({"iec60909", "c37"}));
  add_iec60909_options(app, t);
  app.add_option("--marginal", t.marginal_percent,
                 "margins below this percentage of the rating are marginal. Default: 10")
      ->type_name("PERCENT")
      ->check(CLI::Range(0.0, 99.0));
  app.add_flag("--strict", c.strict, "exit 3 when a device is over or not evaluated");
}

std::string describe(const CLI::App& app, const std::string& what) {
  return what + "\nkiloamp " +
         (app.get_subcommands().empty() ? "" : app.get_subcommands().front()->get_name() + " ") +
         "--help explains\n";
}

}  // namespace

Parsed parse(std::vector<std::string> arguments, std::ostream& out, std::ostream& err) {
  Command c;
  Texts t;
  c.study.threads = static_cast<int>(std::max(1U, std::thread::hardware_concurrency()));
  CLI::App app(kOverview, "kiloamp");
  app.get_formatter()->column_width(34);
  app.set_version_flag("--version", kVersion, "print the version");
  app.require_subcommand(1);
  app.failure_message([](const CLI::App* a, const CLI::Error& e) { return describe(*a, e.what()); });

  CLI::App* check = app.add_subcommand(
      "check",
      "Reads a case, lists every error or every value outside its usual range, counts its elements,\nand "
      "says which buses have no source or no earth path and which defaults a study would use.\nExample: "
      "kiloamp check plant.json");
  check->add_option("CASE", c.case_file, "case file, or - for standard input")->required();
  check
      ->add_option("--scenario", c.scenario,
                   "state of the network, by its id in the case. Default: as written")
      ->type_name("ID");
  check->add_option("--output", c.output, "write to FILE, whole or not at all. Default: standard output")
      ->type_name("FILE");

  CLI::App* sweep = app.add_subcommand(
      "sweep",
      "Faults at every bus: current, X/R, peak, earth current and Thevenin impedances.\nExample: kiloamp "
      "sweep plant.json --fault 3ph,lg --scenario \"T1 out\"");
  add_fault_options(*sweep, c, t, false);
  sweep->add_flag(
      "--contributions", c.contributions,
      "text: a table of the currents from every element at the bus. CSV: see --table; JSON has them always");

  CLI::App* fault = app.add_subcommand(
      "fault",
      "Faults at one bus, with the currents of every element, voltages and neutral currents.\nExample: "
      "kiloamp fault plant.json --bus MAIN-11 --fault lg --earth-impedance 5,0 --depth 1");
  add_fault_options(*fault, c, t, true);

  CLI::App* outages = app.add_subcommand(
      "outages",
      "Three-phase and line-to-ground current at every bus with each element out alone: largest and "
      "smallest, and the outage that\ngoverns; outages that split the network.\nExample: kiloamp outages "
      "plant.json --elements lines,transformers --area main");
  t.one_kind_only = true;
  add_study_options(*outages, c, t);
  outages
      ->add_option("--depth", t.depth,
                   "for each bus only outages up to N branches away. Default: all outages")
      ->type_name("N")
      ->check(CLI::Range(0, 1000000));
  outages->add_option("--area", c.outages.zone, "only buses of this zone of the case. Default: all")
      ->type_name("ZONE");
  outages
      ->add_option("--elements", t.elements,
                   "what goes out, separated by commas: feeders, machines, motors, lines, transformers, "
                   "reactors, couplers, earthing. Default: all but motors and earthing")
      ->type_name("KINDS")
      ->check(into(read_elements, c.outages.kinds));

  CLI::App* duty = app.add_subcommand("duty",
                                      "Judges every breaker, switch, fuse and switchboard of the case by the "
                                      "standard it was rated to: within, "
                                      "marginal, over or\nnot evaluated, with the state, fault and side that "
                                      "govern.\nExample: kiloamp duty plant.json "
                                      "--outages --strict");
  add_duty_options(*duty, c, t);

  CLI::App* relays = app.add_subcommand("relays",
                                        "What each relay measures: faults close-in, at remote buses, at the "
                                        "line's end with the far breaker open and "
                                        "beyond, in the\nintact network, with each neighbouring element out, "
                                        "and at minimum sources.\nExample: kiloamp "
                                        "relays plant.json --everywhere --format csv");
  add_study_options(*relays, c, t);
  relays
      ->add_option("--fault", t.kinds,
                   "kinds of fault, separated by commas: 3ph, lg, ll, llg. Default: all four")
      ->type_name("KINDS")
      ->check(into(read_kinds, c.study.kinds));
  relays->add_flag("--everywhere", c.relays.everywhere,
                   "every branch terminal instead of the relays of the case");
  relays
      ->add_option("--further", c.relays.further,
                   "faults at buses up to N branches beyond the remote bus. Default: 1")
      ->type_name("N")
      ->check(CLI::Range(0, 100));

  // The nearest verb is worth more than the parser's own words for an unknown one.
  static const std::vector<std::string_view> verbs{"check", "sweep", "fault", "outages", "duty", "relays"};
  if (!arguments.empty() && arguments.front().rfind('-', 0) != 0 &&
      std::find(verbs.begin(), verbs.end(), arguments.front()) == verbs.end()) {
    err << "kiloamp: " << must_be(arguments.front(), verbs) << "\nkiloamp --help explains\n";
    return {std::nullopt, kInputWrong};
  }
  if (arguments.empty()) arguments.emplace_back("--help");
  std::reverse(arguments.begin(), arguments.end());  // CLI11 takes them from the back
  try {
    app.parse(arguments);
  } catch (const CLI::CallForHelp&) {
    const auto chosen = app.get_subcommands();
    out << (chosen.empty() ? app.help() : chosen.front()->help("", CLI::AppFormatMode::Sub));
    return {std::nullopt, kRan};
  } catch (const CLI::CallForVersion&) {
    out << kVersion << "\n";
    return {std::nullopt, kRan};
  } catch (const CLI::ExtrasError& e) {
    const auto chosen = app.get_subcommands();
    std::vector<std::string_view> known;
    std::vector<std::string> names;
    if (!chosen.empty())
      for (const CLI::Option* option : chosen.front()->get_options()) names.push_back(option->get_name());
    for (const auto& name : names) known.emplace_back(name);
    const auto extras = app.remaining(true);
    const std::string near = extras.empty() ? "" : nearest(extras.front(), known);
    err << "kiloamp: " << (extras.empty() ? e.what() : "\"" + extras.front() + "\" is not an option here")
        << (near.empty() ? "" : "; did you mean " + near + "?") << "\n"
        << describe(app, "").substr(1);
    return {std::nullopt, kInputWrong};
  } catch (const CLI::ParseError& e) {
    err << "kiloamp: " << describe(app, e.what());
    return {std::nullopt, kInputWrong};
  }
  c.verb = app.get_subcommands().front()->get_name();
  if (t.case_kind == "min") c.study.case_kind = CaseKind::min;
  c.both_kinds = t.case_kind == "both";
  const bool iec = t.method == "iec60909";
  const bool c37 = t.method == "c37", is_duty = c.verb == "duty";
  if (iec) c.study.method = Method::iec60909;
  if (c37) c.study.method = Method::c37;
  if (t.small_motors == "out") c.study.c37.small_motors = ieee_c37::SmallMotors::omitted;
  if (is_duty && iec) c.duty.family = DeviceFamily::iec;
  if (is_duty && c37) c.duty.family = DeviceFamily::ansi;
  if (t.marginal_percent) c.duty.marginal = *t.marginal_percent / 100;
  if (t.edition == "2001") c.study.iec60909.edition = iec60909::Edition::e2001;
  if (!t.kappa.empty()) c.study.iec60909.kappa = static_cast<iec60909::KappaMethod>(t.kappa[0] - 'a');
  c.study.iec60909.tmin_s = t.tmin_s.value_or(c.study.iec60909.tmin_s);
  c.study.iec60909.duration_s = t.duration_s.value_or(c.study.iec60909.duration_s);
  if (c.verb == "fault") c.contributions = true;
  c.outages.depth = t.depth;
  c.outages.threads = c.study.threads;
  const auto misuse = [&](bool wrong, const char* what) {
    if (wrong) err << "kiloamp: " << what << "\n";
    return wrong;
  };
  if (misuse(c.table != "faults" && c.format != "csv", "--table goes with --format csv"))
    return {std::nullopt, kInputWrong};
  const bool iec_options =
      !t.edition.empty() || !t.kappa.empty() || t.tmin_s || t.duration_s || c.intermediate;
  const bool classical_options =
      !t.prefault.empty() || !t.phase.empty() || !t.earth.empty() || c.study.include_shunts;
  if (misuse(!c37 && !t.small_motors.empty() && !(is_duty && !iec), "--small-motors goes with --method c37"))
    return {std::nullopt, kInputWrong};
  if (is_duty) {
    if (misuse(c37 && iec_options, "--edition, --duration and --kappa-method go with --method iec60909"))
      return {std::nullopt, kInputWrong};
    if (misuse(iec && classical_options, "--prefault and --shunts go with --method c37"))
      return {std::nullopt, kInputWrong};
    return {std::move(c), kRan};
  }
  if (misuse(!iec && iec_options,
             "--edition, --tmin, --duration, --kappa-method and --intermediate go with --method iec60909"))
    return {std::nullopt, kInputWrong};
  if (misuse(iec && classical_options,
             "--method iec60909 has its own voltage, bolted faults and no shunts: leave out --prefault, "
             "--phase-impedance, --earth-impedance and --shunts"))
    return {std::nullopt, kInputWrong};
  if (misuse(c.intermediate && c.format != "json", "--intermediate goes with --format json"))
    return {std::nullopt, kInputWrong};
  if (misuse(c.verb == "sweep" && c.contributions && c.format != "text",
             "--contributions goes with --format text; csv has --table contributions, json has them always"))
    return {std::nullopt, kInputWrong};
  return {std::move(c), kRan};
}

}  // namespace kiloamp
