#include "reports/duty_report.hpp"

#include <cmath>

#include "reports/json_parts.hpp"
#include "reports/number_text.hpp"
#include "reports/text_blocks.hpp"
#include "reports/text_table.hpp"

namespace kiloamp {

namespace {

constexpr std::size_t kFlushAt = 1 << 16;
constexpr std::size_t kNamedStates = 8;

std::string fixed(double value, int decimals) {
  std::string out;
  append_fixed(out, value, decimals);
  return out;
}

const char* standard_words(DeviceStandard standard) {
  static constexpr const char* kNames[] = {"IEC 62271-100", "IEC 62271-103",   "IEC 62271-200",
                                           "IEC 60947-2",   "IEC 60947-3",     "IEC 61439",
                                           "IEC 60282-1",   "IEC 60269",       "C37 total current",
                                           "C37 K-factor",  "C37 constant kA", "C37.13",
                                           "C37.20",        "UL 489",          "C37.41",
                                           "UL 248"};
  return kNames[static_cast<std::size_t>(standard)];
}

// The figures of the plate that the checks rest on, besides the ratings themselves.
std::string basis(const Device& d) {
  std::string text;
  const auto add = [&](const char* name, const std::optional<double>& value, const char* unit) {
    if (value) text += (text.empty() ? "" : ", ") + std::string(name) + " " + readable(*value) + unit;
  };
  add("K", d.k_factor, "");
  add("interrupting time", d.interrupting_time_cycles, " cycles");
  add("contact parting", d.contact_parting_cycles, " cycles");
  add("opening time", d.opening_time_s, " s");
  add("time constant", d.dc_time_constant_ms, " ms");
  add("test power factor", d.test_power_factor, "");
  if (d.fused.value_or(false)) text += (text.empty() ? "" : ", ") + std::string("fused");
  return text;
}

// What every format says of the run.
struct Words {
  Words(const Network& network, const DutyTable& table, const DutyOptions& options) : n(network), t(table) {
    StudyOptions study = options.study;
    study.method = Method::iec60909;
    iec = method_words(study) + ", Tk " + readable(study.iec60909.duration_s) + " s for short-time duty";
    study.method = Method::c37;
    ansi = method_words(study);
    marginal_percent = 100 * options.marginal;
  }
  [[nodiscard]] std::string id(ElementRef ref) const { return element(n, ref).id; }
  [[nodiscard]] std::string bus_id(const Device& d) const { return n.bus(d.bus).id; }
  [[nodiscard]] std::string branch(const Device& d) const { return d.branch ? id(*d.branch) : std::string(); }
  [[nodiscard]] std::string state(const DutyCheck& c) const { return state_name(n, t.states[c.state]); }
  [[nodiscard]] std::string counts() const {
    std::string text;
    for (const Verdict v : {Verdict::over, Verdict::not_evaluated, Verdict::marginal, Verdict::within})
      text += (text.empty() ? "" : ", ") + std::string(verdict_name(v)) + " " +
              std::to_string(t.count[static_cast<std::size_t>(v)]);
    return text;
  }

  const Network& n;
  const DutyTable& t;
  std::string iec, ansi;
  double marginal_percent = 10;
};

std::string heading(const Words& w, const ReportFacts& facts) {
  std::string out =
      "kiloamp duty: breakers, fuses and switchboards against the largest prospective currents\n";
  out +=
      paragraph("case         ", w.n.title.value_or("untitled") + " (" + facts.file + ", sha256 " +
                                     facts.sha256.substr(0, 12) + "), " + fixed(w.n.frequency_hz, 0) + " Hz");
  const char* label = "methods      ";
  if (w.t.used_iec) {
    out += paragraph(label, "IEC devices: " + w.iec);
    label = "             ";
  }
  if (w.t.used_c37) out += paragraph(label, "ANSI/IEEE devices: " + w.ansi);
  std::string states;
  for (std::size_t s = 0; s < w.t.states.size() && s < kNamedStates; ++s)
    states += (s > 0 ? "; " : "") + state_name(w.n, w.t.states[s]);
  if (w.t.states.size() > kNamedStates) states += "; ...";
  out += paragraph("states       ", std::to_string(w.t.states.size()) + ": " + states);
  out += paragraph(
      "current      ",
      "through the device: on a branch the larger of the bus total less the branch (fault beyond the "
      "device) and the branch alone (fault at the bus); without a branch the bus total; four kinds of "
      "fault");
  out += paragraph("verdicts     ", w.counts() + "; marginal: margin below " + readable(w.marginal_percent) +
                                        " % of the rating");
  out += defaults_block(w.n, w.t.defaults);
  return out + warnings_block(w.t.warnings, facts.remarks, facts.file);
}

std::string device_table(const Words& w, bool& shortened) {
  TextTable table;
  using Align = TextTable::Align;
  for (const char* name : {"device", "bus", "branch", "rated to", "verdict", "most loaded"})
    table.column(name, "", Align::left);
  table.column("duty", "", Align::decimal);
  table.column("rating", "", Align::decimal);
  table.column("margin", "%", Align::decimal);
  table.column("headroom", "MVA", Align::decimal);
  for (const DeviceDuty& d : w.t.devices) {
    const Device& data = device(w.n, d.device);
    std::vector<std::string> cells{data.id, w.bus_id(data), data.branch ? w.branch(data) : "(bus)",
                                   standard_words(data.standard), verdict_name(d.verdict)};
    if (d.governing) {
      const DutyCheck& c = d.checks[*d.governing];
      cells.insert(cells.end(), {quantity_name(c.quantity), readable(c.duty), readable(c.rating),
                                 fixed(100 * c.margin(), 1)});
    } else {
      cells.insert(cells.end(), {"", "-", "-", "-"});
    }
    cells.push_back(d.headroom_mva ? readable(*d.headroom_mva) : "-");
    table.row(std::move(cells));
  }
  std::string text = table.text();
  shortened = shortened || table.was_shortened();
  return text;
}

std::string check_table(const Words& w, bool& shortened) {
  TextTable table;
  using Align = TextTable::Align;
  table.column("device", "", Align::left);
  table.column("check", "", Align::left);
  table.column("through", "kA", Align::decimal);
  table.column("X/R", "", Align::decimal);
  table.column("factor", "", Align::decimal);
  table.column("duty", "kA or %", Align::decimal);
  table.column("rating", "kA or %", Align::decimal);
  table.column("verdict", "", Align::left);
  table.column("fault", "", Align::left);
  table.column("side", "", Align::left);
  table.column("state", "", Align::left);
  static constexpr const char* kSides[] = {"bus", "beyond", "own"};
  const auto or_dash = [](const std::optional<double>& value) {
    return value ? readable(*value) : std::string("-");
  };
  for (const DeviceDuty& d : w.t.devices) {
    bool first = true;
    for (const DutyCheck& c : d.checks) {
      std::vector<std::string> cells{std::exchange(first, false) ? w.id(d.device) : "",
                                     quantity_name(c.quantity)};
      if (c.has_duty())
        cells.insert(cells.end(),
                     {readable(c.through_ka), or_dash(c.x_over_r), or_dash(c.factor), readable(c.duty),
                      readable(c.rating), verdict_name(c.verdict), fault_short_name(c.kind),
                      kSides[static_cast<std::size_t>(c.side)], w.state(c)});
      else
        cells.insert(cells.end(), {"-", "-", "-", "-", "-", verdict_name(c.verdict), "", "", ""});
      table.row(std::move(cells));
    }
  }
  std::string text = table.text();
  shortened = shortened || table.was_shortened();
  return text;
}

std::string feeds_text(const Words& w, const DeviceDuty& d) {
  std::string text;
  for (const DutyFeed& f : d.feeds)
    text += (text.empty() ? "" : "; ") + w.id(f.source) + " " + readable(f.ka) + " kA (" +
            fixed(100 * f.share, 0) + " %)";
  return text;
}

std::string remarks_text(const Words& w) {
  std::string missing, notes, fed;
  for (const DeviceDuty& d : w.t.devices) {
    const std::string label = "  " + w.id(d.device) + ": ";
    for (const DutyCheck& c : d.checks) {
      if (c.verdict == Verdict::not_evaluated)
        missing += paragraph(label, quantity_name(c.quantity) + (": " + c.why));
      if (!c.note.empty()) notes += paragraph(label, quantity_name(c.quantity) + (": " + c.note));
    }
    for (const std::string& finding : d.findings) notes += paragraph(label, finding);
    if (!d.feeds.empty())
      fed += paragraph(
          label, std::string(quantity_name(d.checks[*d.governing].quantity)) + " from " + feeds_text(w, d));
  }
  std::string out;
  if (!missing.empty()) out += "\nNot evaluated\n" + missing;
  if (!notes.empty()) out += "\nNotes\n" + notes;
  if (!fed.empty())
    out += "\nSources of what governs (positive sequence, up to five; full converters left out)\n" + fed;
  return out;
}

void write_text(const Words& w, const ReportFacts& facts, const Sink& sink) {
  bool shortened = false;
  sink(heading(w, facts) + "\n");
  if (w.t.devices.empty()) {
    sink("This case has no breaker, fuse or switchboard in service.\n\n" + cautions_block());
    return;
  }
  sink(device_table(w, shortened) + "\n");
  sink(check_table(w, shortened));
  sink("\n" +
       paragraph("",
                 "side: bus = total at the bus, beyond = fault on the branch's side of the device, own = "
                 "fault at the bus. headroom: three-phase source that may still be added at the bus, at "
                 "unchanged X/R and decay; negative: too much by that."));
  if (shortened) sink("Long names are shortened in the middle (…); CSV and JSON carry them whole.\n");
  sink(remarks_text(w));
  sink("\n" + cautions_block());
}

void write_csv(const Words& w, const Sink& sink) {
  std::string out =
      "device,kind,bus,nominal_kv,branch,standard,basis,rated_kv,quantity,unit,verdict,through_ka,x_over_r,"
      "nacd,factor,"
      "duty,rating,loading_percent,margin,margin_percent,state,fault,side,why,note,headroom_mva,sources\r\n";
  constexpr int kDecimals = 6;
  const auto optional = [&](const std::optional<double>& value) {
    out += ',';
    if (value) append_fixed(out, *value, kDecimals);
  };
  for (const DeviceDuty& d : w.t.devices) {
    const Device& data = device(w.n, d.device);
    for (std::size_t i = 0; i < d.checks.size(); ++i) {
      const DutyCheck& c = d.checks[i];
      const bool known = c.has_duty(), governs = d.governing == i;
      out += csv_field(data.id) + ',' + kind_name(d.device.kind) + ',' + csv_field(w.bus_id(data)) + ',';
      append_fixed(out, w.n.bus(data.bus).nominal_kv, kDecimals);
      out += ',' + csv_field(w.branch(data)) + ',' + standard_words(data.standard) + ',' +
             csv_field(basis(data));
      optional(data.rated_kv);
      out += std::string(",") + quantity_name(c.quantity) + ',' + quantity_unit(c.quantity) + ',' +
             verdict_name(c.verdict);
      const auto given = [&](double value) { return known ? std::optional(value) : std::nullopt; };
      optional(given(c.through_ka));
      optional(c.x_over_r);
      optional(c.nacd);
      optional(c.factor);
      optional(given(c.duty));
      optional(given(c.rating));
      optional(known ? std::optional(100 * c.duty / c.rating) : std::nullopt);
      optional(given(c.rating - c.duty));
      optional(known ? std::optional(100 * c.margin()) : std::nullopt);
      out += ',' + (known ? csv_field(w.state(c)) + ',' + fault_name(c.kind) + ',' + side_name(c.side)
                          : std::string(",,"));
      out += ',' + csv_field(c.why) + ',' + csv_field(c.note);
      optional(governs ? d.headroom_mva : std::nullopt);
      out += ',' + (governs ? csv_field(feeds_text(w, d)) : std::string()) + "\r\n";
    }
    if (out.size() > kFlushAt) {
      sink(out);
      out.clear();
    }
  }
  sink(out);
}

class JsonWriter {
 public:
  explicit JsonWriter(const Words& words) : w(words) {}

  std::string device_object(const DeviceDuty& d) {
    const Device& data = device(w.n, d.device);
    out = "{\"device\": " + json_text(data.id) + ", \"kind\": \"" + kind_name(d.device.kind) +
          "\", \"bus\": " + json_text(w.bus_id(data)) +
          ", \"branch\": " + (data.branch ? json_text(w.branch(data)) : "null") + ", \"standard\": \"" +
          standard_words(data.standard) + "\", \"basis\": " + json_text(basis(data)) + ", \"verdict\": \"" +
          verdict_name(d.verdict) + "\"";
    append_member(out, "rated_kv", data.rated_kv);
    append_member(out, "headroom_mva", d.headroom_mva);
    out += ", \"governing\": " + (d.governing ? std::to_string(*d.governing) : "null") + ",\n \"checks\": [";
    for (std::size_t i = 0; i < d.checks.size(); ++i) check(d.checks[i], i == 0 ? "\n  " : ",\n  ");
    out += "],\n \"sources\": [";
    for (std::size_t i = 0; i < d.feeds.size(); ++i) {
      out += (i > 0 ? ", " : "") + std::string("{\"element\": ") + json_text(w.id(d.feeds[i].source));
      append_member(out, "ka", d.feeds[i].ka);
      append_member(out, "share", d.feeds[i].share);
      out += '}';
    }
    out += "], \"findings\": [";
    for (std::size_t i = 0; i < d.findings.size(); ++i) out += (i > 0 ? ", " : "") + json_text(d.findings[i]);
    return out + "]}";
  }

 private:
  void check(const DutyCheck& c, const char* gap) {
    const bool known = c.has_duty();
    out += gap + std::string("{\"quantity\": \"") + quantity_name(c.quantity) + "\", \"unit\": \"" +
           quantity_unit(c.quantity) + "\", \"verdict\": \"" + verdict_name(c.verdict) + "\"";
    if (!c.why.empty()) out += ", \"why\": " + json_text(c.why);
    if (!c.note.empty()) out += ", \"note\": " + json_text(c.note);
    if (known) {
      append_member(out, "through_ka", c.through_ka);
      append_member(out, "x_over_r", c.x_over_r);
      append_member(out, "nacd", c.nacd);
      append_member(out, "factor", c.factor);
      append_member(out, "duty", c.duty);
      append_member(out, "rating", c.rating);
      append_member(out, "margin_percent", 100 * c.margin());
      out += ", \"state\": " + json_text(w.state(c)) + ", \"fault\": \"" + fault_name(c.kind) +
             "\", \"side\": \"" + side_name(c.side) + "\"";
    }
    out += '}';
  }

  const Words& w;
  std::string out;
};

void write_json(const Words& w, const ReportFacts& facts, const Sink& sink) {
  std::string out =
      "{\n\"format\": \"kiloamp-results\", \"version\": 1, \"study\": \"duty\", \"case\": {\"title\": " +
      (w.n.title ? json_text(*w.n.title) : "null") + ", \"file\": " + json_text(facts.file) +
      ", \"sha256\": " + json_text(facts.sha256) +
      "},\n\"methods\": {\"iec\": " + (w.t.used_iec ? json_text(w.iec) : "null") +
      ", \"ansi\": " + (w.t.used_c37 ? json_text(w.ansi) : "null") + "},\n\"states\": [";
  for (std::size_t s = 0; s < w.t.states.size(); ++s)
    out += (s > 0 ? ", " : "") + json_text(state_name(w.n, w.t.states[s]));
  out += "],\n\"marginal_percent\": ";
  append_shortest(out, w.marginal_percent);
  out += ",\n\"count\": {";
  for (std::size_t v = 0; v < w.t.count.size(); ++v)
    out += (v > 0 ? ", \"" : "\"") + std::string(verdict_name(static_cast<Verdict>(v))) +
           "\": " + std::to_string(w.t.count[v]);
  out += "},\n" + json_assumptions(w.n, w.t.defaults, w.t.warnings) + "\"devices\": [";
  JsonWriter writer(w);
  const char* gap = "\n";
  for (const DeviceDuty& d : w.t.devices) {
    out += gap + writer.device_object(d);
    gap = ",\n";
    if (out.size() > kFlushAt) {
      sink(out);
      out.clear();
    }
  }
  sink(out + "\n]\n}\n");
}

}  // namespace

void write_duty(const Network& network, const DutyTable& table, const DutyOptions& options,
                const ReportFacts& facts, DutyFormat format, const Sink& sink) {
  const Words words(network, table, options);
  if (format == DutyFormat::csv)
    write_csv(words, sink);
  else if (format == DutyFormat::json)
    write_json(words, facts, sink);
  else
    write_text(words, facts, sink);
}

}  // namespace kiloamp
