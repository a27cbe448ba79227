#include <algorithm>
#include <cmath>
#include <map>

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
  TextPiece(const Studies& studies, const ReportFacts& facts)
      : study_(*studies.front()), facts_(facts), several_(studies.size() > 1) {}

  void fault(const StudiedFault& studied) override {
    const FaultResult& r = studied.result;
    const bool again = last_ && *last_ == r.fault.bus;
    last_ = r.fault.bus;
    const Bus& bus = study_.network().bus(r.fault.bus);
    std::vector<std::string> cells{again ? "" : bus.id, again ? "" : readable(bus.nominal_kv),
                                   fault_short_name(r.fault.kind)};
    if (several_) cells.emplace_back(case_kind_name(studied.case_kind));
    if (studied.iec60909 != nullptr) {
      const iec60909::Quantities& q = *studied.iec60909;
      cells.push_back(readable(q.ikss_ka));
      for (const auto& value : {q.ip_ka, q.ib_ka, q.ik_ka, q.ith_ka, q.r_over_x, q.kappa})
        cells.push_back(or_dash(value));
      for (const auto& one : q.not_evaluated) ++not_evaluated[one.quantity + ": " + one.why];
    } else if (studied.c37 != nullptr) {
      const ieee_c37::Quantities& q = *studied.c37;
      cells.push_back(readable(q.first_cycle.ez_ka));
      for (const auto& value : {q.first_cycle.x_over_r, q.asymmetric_ka, q.crest_ka})
        cells.push_back(or_dash(value));
      cells.push_back(readable(q.interrupting.ez_ka));
      cells.push_back(or_dash(q.interrupting.x_over_r));
      cells.push_back(r.has_source ? fixed(q.nacd, 2) : "-");
      cells.push_back(or_dash(q.delayed_ka));
    } else {
      cells.push_back(readable(r.current_ka));
      cells.push_back(r.current_ka == 0 ? "-" : or_dash(r.x_over_r));
      cells.push_back(or_dash(r.peak_ka));
    }
    cells.push_back(readable(std::abs(r.earth_current_ka)));
    if (studied.iec60909 == nullptr && studied.c37 == nullptr)
      for (const auto& z : {r.z1_ohm, r.z0_ohm}) {
        cells.push_back(z ? readable(z->real()) : "-");
        cells.push_back(z ? readable(z->imag()) : "-");
      }
    add_row(std::move(cells), again, studied.case_kind);
    if (facts_.contributions) details += detail(studied);
  }

  std::map<std::string, std::size_t> not_evaluated;  ///< quantity and reason: how often
  std::vector<std::vector<std::string>> rows;
  std::string details;

 private:
  // The smallest current of a kind stands below the largest of the same kind, although it is solved later.
  void add_row(std::vector<std::string> cells, bool again, CaseKind kind) {
    if (!again) {
      first_row_ = rows.size();
      smallest_ = 0;
    }
    rows.push_back(std::move(cells));
    if (!several_ || kind != CaseKind::min) return;
    const auto place = rows.begin() + static_cast<std::ptrdiff_t>(first_row_ + 2 * smallest_ + 1);
    std::rotate(place, rows.end() - 1, rows.end());
    (*place)[2].clear();  // the kind of fault is said in the row above
    ++smallest_;
  }

  std::string detail(const StudiedFault& studied) {
    const FaultResult& r = studied.result;
    std::string out = "\n" + study_.network().bus(r.fault.bus).id + ", " + fault_words(r.fault.kind) +
                      (several_ ? std::string(", ") + case_kind_name(studied.case_kind) : "") + ": " +
                      readable(r.current_ka) + " kA\n";
    if (studied.inside_unit) out += "  inside a power station unit: factors K_G,S and K_T,S\n";
    if (studied.iec60909 != nullptr && r.has_source) out += quantities(*studied.iec60909);
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

  static std::string quantities(const iec60909::Quantities& q) {
    std::string text = "c " + readable(q.c) + ", S\"k " + readable(q.skss_mva) + " MVA";
    const auto add = [&](const char* name, const std::optional<double>& value, const char* unit) {
      if (value) text += std::string(", ") + name + " " + readable(*value) + unit;
    };
    add("i_dc at tmin", q.idc_ka, " kA");
    add("asymmetric Ib", q.ib_asymmetric_ka, " kA");
    add("m", q.m, "");
    add("n", q.n, "");
    add("I2t", q.i2t_ka2s, " kA2s");
    if (q.converter_ka > 0) add("of it converters", q.converter_ka, " kA");
    if (q.motor_share_percent && *q.motor_share_percent > 0.05)
      text +=
          ", motors add " + readable(*q.motor_share_percent) + " % (" +
          (*q.motor_share_percent <= 5 ? "the 5 % rule would allow to neglect them" : "not to be neglected") +
          ")";
    return paragraph("  ", text);
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
  bool several_;
  std::optional<BusIndex> last_;
  std::size_t first_row_ = 0, smallest_ = 0;  // of the bus at hand
};

class TextReport : public FaultReport {
 public:
  TextReport(const Studies& studies, ReportFacts facts, Sink sink)
      : studies_(studies), study_(*studies.front()), facts_(std::move(facts)), sink_(std::move(sink)) {
    table_.column("bus", "", Align::left);
    table_.column("nominal", "kV", Align::decimal);
    table_.column("fault", "", Align::left);
    if (studies.size() > 1) table_.column("case", "", Align::left);
    if (study_.iec60909() != nullptr) {
      for (const char* current : {"I\"k", "ip", "Ib", "Ik", "Ith"})
        table_.column(current, "kA", Align::decimal);
      table_.column("R/X", "", Align::decimal);
      table_.column("kappa", "", Align::decimal);
      table_.column("earth", "kA", Align::decimal);
      return;
    }
    if (study_.c37() != nullptr) {
      table_.column("1st cycle", "kA", Align::decimal);
      table_.column("X/R", "", Align::decimal);
      table_.column("total rms", "kA", Align::decimal);
      table_.column("crest", "kA", Align::decimal);
      table_.column("interrupting", "kA", Align::decimal);
      table_.column("X/R", "", Align::decimal);
      table_.column("NACD", "", Align::decimal);
      table_.column("30 cycles", "kA", Align::decimal);
      table_.column("earth", "kA", Align::decimal);
      return;
    }
    table_.column("current", "kA", Align::decimal);
    table_.column("X/R", "", Align::decimal);
    table_.column("peak", "kA", Align::decimal);
    table_.column("earth", "kA", Align::decimal);
    for (const char* z : {"R1", "X1", "R0", "X0"}) table_.column(z, "ohm", Align::decimal);
  }

  void begin() override { sink_(heading_block(studies_, facts_) + "\n"); }
  std::unique_ptr<ReportPiece> make_piece() const override {
    return std::make_unique<TextPiece>(studies_, facts_);
  }
  void add(ReportPiece& piece) override {
    auto& from = static_cast<TextPiece&>(piece);
    for (auto& row : from.rows) table_.row(std::move(row));
    details_ += from.details;
    for (const auto& [what, count] : from.not_evaluated) not_evaluated_[what] += count;
    from.not_evaluated.clear();
    from.rows.clear();
    from.details.clear();
  }

  void end(const CrossCheck* check) override {
    sink_(table_.text());
    if (study_.c37() != nullptr)
      sink_(
          "\n" +
          paragraph("",
                    "1st cycle, interrupting, 30 cycles: E/Z, symmetrical rms, largest phase. X/R: separate "
                    "networks of X and of R. total rms: at half a cycle. NACD: remote share of the "
                    "interrupting current, 1 = no ac decay. earth: 3 I0, first cycle. CSV and JSON add "
                    "E/X, complex X/R, 1.6 and 2.7 times, and the factors of breakers and fuses. - : no "
                    "value."));
    else if (study_.iec60909() == nullptr)
      sink_(
          "\ncurrent: largest phase current, rms. earth: 3 I0. R1, X1, R0, X0: Thevenin impedances; - : no "
          "path, or no value.\n");
    else
      sink_("\n" +
            paragraph("",
                      "I\"k: initial, largest phase. ip: peak. Ib: symmetrical breaking at tmin. Ik: "
                      "steady state. Ith: thermal equivalent over Tk. earth: 3 I0. - : not evaluated, or "
                      "no current."));
    for (const auto& [what, count] : not_evaluated_)
      sink_(paragraph("not evaluated  ",
                      what + " (" + std::to_string(count) + (count == 1 ? " fault)" : " faults)")));
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
  Studies studies_;
  const Study& study_;
  ReportFacts facts_;
  Sink sink_;
  TextTable table_;
  std::string details_;
  std::map<std::string, std::size_t> not_evaluated_;
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

std::string warnings_block(const std::vector<std::string>& warnings, std::size_t remarks,
                           const std::string& file) {
  std::string out;
  const char* label = "warnings     ";
  for (const std::string& warning : warnings) {
    out += paragraph(label, warning);
    label = "             ";
  }
  if (remarks > 0)
    out += paragraph(label, std::to_string(remarks) + (remarks == 1 ? " value is" : " values are") +
                                " outside the usual range: kiloamp check " + file);
  return out;
}

std::string heading_block(const Studies& studies, const ReportFacts& facts) {
  const Study& study = *studies.front();
  const StudyOptions& options = study.options();
  const Network& n = study.network();
  std::string out =
      "kiloamp " + facts.study + ": prospective short-circuit currents, " + method_words(options) + "\n";
  out += paragraph("case         ", n.title.value_or("untitled") + " (" + facts.file + ", sha256 " +
                                        facts.sha256.substr(0, 12) + ")");
  out += paragraph(
      "state        ",
      (study.scenario_id().empty() ? std::string("as written") : "scenario \"" + study.scenario_id() + "\"") +
          ", " + fixed(n.frequency_hz, 0) + " Hz");
  const char* label = "case kind    ";
  for (const Study* one : studies) {
    out += paragraph(label, case_kind_words(one->options()));
    label = "             ";
  }
  label = "prefault     ";
  for (const Study* one : studies) {
    out += paragraph(
        label, (studies.size() > 1 ? case_kind_name(one->options().case_kind) + std::string(": ") : "") +
                   prefault_words(*one));
    label = "             ";
  }
  out += paragraph("impedance    ", fault_impedance_words(options));
  out += paragraph("left out     ",
                   options.include_shunts
                       ? "nothing: line charging and shunts are in all three sequences"
                       : "line charging and shunts in positive and negative sequence; static load");
  if (facts.peaks) out += paragraph("peak         ", peak_words(options));
  if (const auto* evaluation = study.iec60909()) {
    if (facts.peaks)
      out += paragraph("times        ", "tmin " + readable(options.iec60909.tmin_s) + " s for Ib, Tk " +
                                            readable(options.iec60909.duration_s) + " s for Ith");
    std::size_t allowed = 0;
    for (const auto& rule : evaluation->motor_rules()) allowed += rule.would_allow() ? 1 : 0;
    if (!evaluation->motor_rules().empty())
      out += paragraph("motors       ",
                       "all taken; rules that would allow to neglect them (6.10): fulfilled at " +
                           std::to_string(allowed) + " of " +
                           std::to_string(evaluation->motor_rules().size()) + " places (JSON lists them)");
  }
  out += defaults_block(n, study.defaults_used());
  return out + warnings_block(warnings_of(studies), facts.remarks, facts.file);
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

std::unique_ptr<FaultReport> text_report(const Studies& studies, const ReportFacts& facts, Sink sink) {
  return std::make_unique<TextReport>(studies, facts, std::move(sink));
}

}  // namespace kiloamp
