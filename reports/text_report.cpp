#include <algorithm>
#include <cmath>

#include "reports/number_text.hpp"
#include "reports/study_words.hpp"
#include "reports/text_blocks.hpp"
#include "reports/text_table.hpp"

namespace kiloamp {

namespace {

using Align = TextTable::Align;
constexpr std::size_t kNamedDefaults = 4;

std::string fixed(double value, int decimals) {
  std::string out;
  append_fixed(out, value, decimals);
  return out;
}
// A blank cell says that there is nothing; a dash that the quantity has no value here.
std::string or_dash(const std::optional<double>& value) { return value ? readable(*value) : "-"; }

void phase_columns(TextTable& table, const char* quantity, const char* unit) {
  for (const char* phase : {"a", "b", "c"}) {
    table.column(std::string(quantity) + phase, unit, Align::decimal);
    table.column("at", "deg", Align::decimal);
  }
}
void add_phasor(std::vector<std::string>& cells, Complex value) {
  const bool nothing = std::abs(value) < 1e-9;
  cells.push_back(nothing ? "0.0" : readable(std::abs(value)));
  cells.push_back(nothing ? "-" : fixed(degrees(value), 1));
}
void add_phases(std::vector<std::string>& cells, const BySequence<Complex>& sequence) {
  for (const Complex phase : to_phases(sequence)) add_phasor(cells, phase);
}

class TextPiece : public ReportPiece {
 public:
  TextPiece(const Study& study, const ReportFacts& facts) : study_(study), facts_(facts) {}

  void fault(const FaultResult& r) override {
    const bool again = last_ && *last_ == r.fault.bus;
    last_ = r.fault.bus;
    const Bus& bus = study_.network().bus(r.fault.bus);
    std::vector<std::string> cells{again ? "" : bus.id, again ? "" : readable(bus.nominal_kv),
                                   fault_short_name(r.fault.kind)};
    cells.push_back(readable(r.current_ka));
    cells.push_back(r.current_ka == 0 ? "-" : or_dash(r.x_over_r));
    cells.push_back(or_dash(r.peak_ka));
    cells.push_back(readable(std::abs(r.earth_current_ka)));
    for (const auto& z : {r.z1_ohm, r.z0_ohm}) {
      cells.push_back(z ? readable(z->real()) : "-");
      cells.push_back(z ? readable(z->imag()) : "-");
    }
    rows.push_back(std::move(cells));
    if (facts_.contributions) details += detail(r);
  }

  std::vector<std::vector<std::string>> rows;
  std::string details;

 private:
  std::string detail(const FaultResult& r) {
    std::string out = "\n" + study_.network().bus(r.fault.bus).id + ", " + fault_words(r.fault.kind) + ": " +
                      readable(r.current_ka) + " kA\n";
    if (!r.has_source) return out + "  no source reaches this bus\n";
    out += currents("current from the element into the bus", r.contributions, &r);
    if (!facts_.surroundings) return out;
    if (!r.branch_currents.empty())
      out +=
          currents("currents further away, from the element into the bus named", r.branch_currents, nullptr);
    TextTable voltages;
    voltages.column("voltage at bus", "", Align::left);
    phase_columns(voltages, "U", "kV");
    voltages.column("3U0", "kV", Align::decimal);
    for (const BusVoltage& v : r.voltages) {
      std::vector<std::string> cells{study_.network().bus(v.bus).id};
      add_phases(cells, v.sequence_kv);
      cells.push_back(readable(3 * std::abs(v.sequence_kv[kZero])));
      voltages.row(std::move(cells));
    }
    out += "\n" + voltages.text();
    TextTable neutrals;
    neutrals.column("neutral of", "", Align::left);
    neutrals.column("at bus", "", Align::left);
    neutrals.column("current", "kA", Align::decimal);
    neutrals.column("at", "deg", Align::decimal);
    for (const NeutralCurrent& n : r.neutrals) {
      std::vector<std::string> cells{element(study_.network(), n.element).id, study_.network().bus(n.bus).id};
      add_phasor(cells, n.current_ka);
      neutrals.row(std::move(cells));
    }
    if (!neutrals.empty()) out += "\n" + neutrals.text();
    return out;
  }

  // With `fault` given: shares of its current, measured along it in the phase that carries it.
  std::string currents(const char* title, const std::vector<Contribution>& list, const FaultResult* fault) {
    TextTable table;
    table.column("element", "", Align::left);
    if (fault == nullptr) table.column("bus", "", Align::left);
    phase_columns(table, "I", "kA");
    if (fault != nullptr) table.column("share", "%", Align::decimal);
    for (const Contribution& c : list) {
      std::vector<std::string> cells{element(study_.network(), c.element).id};
      if (fault == nullptr) cells.push_back(study_.network().bus(c.bus).id);
      add_phases(cells, c.sequence_ka);
      if (fault != nullptr) {
        const bool on_b = fault->fault.kind == FaultKind::line_to_line ||
                          fault->fault.kind == FaultKind::double_line_to_ground;
        const Complex total = to_phases(fault->sequence_ka)[on_b ? 1 : 0],
                      part = to_phases(c.sequence_ka)[on_b ? 1 : 0];
        cells.push_back(std::abs(total) < 1e-9
                            ? "-"
                            : fixed(100 * (part * std::conj(total)).real() / std::norm(total), 1));
      }
      table.row(std::move(cells));
    }
    return std::string("\n") + title + "\n" + table.text();
  }

  const Study& study_;
  const ReportFacts& facts_;
  std::optional<BusIndex> last_;
};

class TextReport : public FaultReport {
 public:
  TextReport(const Study& study, ReportFacts facts, Sink sink)
      : study_(study), facts_(std::move(facts)), sink_(std::move(sink)) {
    table_.column("bus", "", Align::left);
    table_.column("nominal", "kV", Align::decimal);
    table_.column("fault", "", Align::left);
    table_.column("current", "kA", Align::decimal);
    table_.column("X/R", "", Align::decimal);
    table_.column("peak", "kA", Align::decimal);
    table_.column("earth", "kA", Align::decimal);
    for (const char* z : {"R1", "X1", "R0", "X0"}) table_.column(z, "ohm", Align::decimal);
  }

  void begin() override { sink_(heading_block(study_, facts_) + "\n"); }
  std::unique_ptr<ReportPiece> make_piece() const override {
    return std::make_unique<TextPiece>(study_, facts_);
  }
  void add(ReportPiece& piece) override {
    auto& from = static_cast<TextPiece&>(piece);
    for (auto& row : from.rows) table_.row(std::move(row));
    details_ += from.details;
    from.rows.clear();
    from.details.clear();
  }

  void end(const CrossCheck* check) override {
    sink_(table_.text());
    sink_(
        "\ncurrent: largest phase current, rms. earth: 3 I0. R1, X1, R0, X0: Thevenin impedances; - : no "
        "path, or no value.\n");
    if (table_.was_shortened())
      sink_("Long names are shortened in the middle (…); CSV and JSON carry them whole.\n");
    sink_(details_);
    if (check != nullptr) {
      std::string text = "solved again in phase coordinates: " + std::to_string(check->faults) +
                         " faults, largest relative difference ";
      text += readable(check->largest);
      if (check->largest > 0)
        text += " (" + check->quantity + ", " + fault_words(check->kind) + " at " +
                study_.network().bus(check->bus).id + ")";
      sink_("\n" + paragraph("cross-check  ",
                             text + (check->largest <= kCrossCheckLimit ? ": agrees"
                                                                        : ": DISAGREES, limit 0.000001")));
    }
    sink_("\n" + cautions_block());
  }

 private:
  const Study& study_;
  ReportFacts facts_;
  Sink sink_;
  TextTable table_;
  std::string details_;
};

}  // namespace

std::string paragraph(const std::string& first, const std::string& text) {
  const std::size_t indent = display_width(first);
  std::string out = first, line;
  std::size_t used = indent;
  for (std::size_t at = 0; at < text.size();) {
    const std::size_t space = std::min(text.find(' ', at), text.size());
    const std::string word = text.substr(at, space - at);
    const std::size_t width = display_width(word);
    if (used > indent && used + 1 + width > kTextWidth) {
      out += '\n' + std::string(indent, ' ');
      used = indent;
    } else if (used > indent) {
      out += ' ';
      ++used;
    }
    out += word;
    used += width;
    at = space + 1;
  }
  return out + '\n';
}

std::string defaults_block(const Network& network, const std::vector<DefaultUse>& defaults) {
  std::string out;
  const char* label = "defaults     ";
  for (const DefaultUse& use : defaults) {
    std::string text = use.field + ": " + use.value + " (" + use.source + "), " +
                       std::to_string(use.elements.size()) + "x: ";
    for (std::size_t i = 0; i < use.elements.size() && i < kNamedDefaults; ++i)
      text += (i > 0 ? ", " : "") + element(network, use.elements[i]).id;
    if (use.elements.size() > kNamedDefaults) text += ", ...";
    out += paragraph(label, text);
    label = "             ";
  }
  if (defaults.empty()) out += paragraph(label, "none used");
  return out;
}

std::string heading_block(const Study& study, const ReportFacts& facts) {
  const Network& n = study.network();
  std::string out =
      "kiloamp " + facts.study +
      ": prospective short-circuit currents, classical method (voltage behind impedance, no load currents)\n";
  out += paragraph("case         ", n.title.value_or("untitled") + " (" + facts.file + ", sha256 " +
                                        facts.sha256.substr(0, 12) + ")");
  out += paragraph(
      "state        ",
      (study.scenario_id().empty() ? std::string("as written") : "scenario \"" + study.scenario_id() + "\"") +
          ", " + fixed(n.frequency_hz, 0) + " Hz");
  out += paragraph("case kind    ", case_kind_words(study.options()));
  out += paragraph("prefault     ", prefault_words(study));
  out += paragraph("impedance    ", fault_impedance_words(study.options()));
  out += paragraph("left out     ",
                   study.options().include_shunts
                       ? "nothing: line charging and shunts are in all three sequences"
                       : "line charging and shunts in positive and negative sequence; static load");
  out += paragraph("peak         ", kPeakFormula);
  out += defaults_block(n, study.defaults_used());
  const char* label = "warnings     ";
  for (const std::string& warning : study.warnings()) {
    out += paragraph(label, warning);
    label = "             ";
  }
  if (facts.remarks > 0)
    out +=
        paragraph(label, std::to_string(facts.remarks) + (facts.remarks == 1 ? " value is" : " values are") +
                             " outside the usual range: kiloamp check " + facts.file);
  return out;
}

std::string cautions_block() {
  std::string out = "Cautions\n";
  int number = 1;
  for (const std::string& caution : cautions()) {
    out += paragraph((number < 10 ? " " : "") + std::to_string(number) + "  ", caution);
    ++number;
  }
  return out;
}

std::unique_ptr<FaultReport> text_report(const Study& study, const ReportFacts& facts, Sink sink) {
  return std::make_unique<TextReport>(study, facts, std::move(sink));
}

}  // namespace kiloamp
