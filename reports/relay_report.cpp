#include "reports/relay_report.hpp"

#include <algorithm>

#include "reports/json_parts.hpp"
#include "reports/number_text.hpp"
#include "reports/text_blocks.hpp"
#include "reports/text_table.hpp"

namespace kiloamp {

namespace {

constexpr int kAmount = 6, kAngle = 3;

bool is_earth_fault(FaultKind kind) {
  return kind == FaultKind::line_to_ground || kind == FaultKind::double_line_to_ground;
}

// The loop that measures the distance to a fault of that kind.
const std::optional<Complex>& faulted_loop(const RelayRow& row) {
  return row.kind == FaultKind::line_to_ground ? row.loops.a : row.loops.bc;
}

// The rows of one place and kind of fault in which the relay sees current.
struct Group {
  const RelayRow* intact = nullptr;
  const RelayRow* largest = nullptr;
  const RelayRow* smallest = nullptr;
  double most_residual_ka = 0, least_residual_ka = -1;  ///< 3 I0
};
std::vector<Group> groups_of(std::span<const RelayRow> rows) {
  std::vector<Group> groups;
  std::vector<const RelayRow*> first;
  for (const RelayRow& row : rows) {
    if (!row.infeed_factor) continue;  // the fault is not fed through this place
    const auto same = [&](const RelayRow* f) {
      return f->place == row.place && f->place_bus == row.place_bus && f->kind == row.kind;
    };
    auto found = std::find_if(first.begin(), first.end(), same);
    if (found == first.end()) {
      found = first.insert(first.end(), &row);
      groups.emplace_back();
    }
    Group& group = groups[static_cast<std::size_t>(found - first.begin())];
    const double ka = largest_phase(row.primary.current_ka),
                 residual = 3 * std::abs(row.primary.current_ka[kZero]);
    if (row.state.kind == RelayStateKind::intact) group.intact = &row;
    if (group.largest == nullptr || ka > largest_phase(group.largest->primary.current_ka))
      group.largest = &row;
    if (group.smallest == nullptr || ka < largest_phase(group.smallest->primary.current_ka))
      group.smallest = &row;
    group.most_residual_ka = std::max(group.most_residual_ka, residual);
    group.least_residual_ka =
        group.least_residual_ka < 0 ? residual : std::min(group.least_residual_ka, residual);
  }
  std::stable_sort(groups.begin(), groups.end(), [](const Group& a, const Group& b) {
    return std::tuple(a.largest->place, at(a.largest->place_bus)) <
           std::tuple(b.largest->place, at(b.largest->place_bus));
  });
  return groups;
}

std::string ratio_words(const RelayLocation& l) {
  std::string text;
  if (l.ct_ratio) text += ", ct " + readable(*l.ct_ratio) + ":1";
  if (l.vt_ratio) text += ", vt " + readable(*l.vt_ratio) + ":1";
  return text;
}

std::string text_location(const RelayStudy& study, const RelayLocation& l, std::span<const RelayRow> rows) {
  const Network& n = study.intact().network();
  std::string out = "\n" + (l.relay ? element(n, *l.relay).id + ": " : std::string()) + n.bus(l.bus).id +
                    " into " + element(n, l.branch).id + ratio_words(l);
  if (l.branch.kind == ElementKind::line) {
    const Complex k0 = residual_compensation_of(study.intact(), l.branch);
    out += ", k0 " + readable(std::abs(k0)) + " at " + readable(degrees(k0)) + " deg";
  }
  out += "\n";
  if (rows.empty()) return out + "  no source reaches the faults of this place\n";
  TextTable table;
  using Align = TextTable::Align;
  for (const char* name : {"fault at", "bus", ""}) table.column(name, "", Align::left);
  table.column("largest", "kA", Align::decimal);
  table.column("in state", "", Align::left);
  table.column("smallest", "kA", Align::decimal);
  table.column("in state", "", Align::left);
  table.column("3I0", "kA", Align::decimal);
  table.column("to", "kA", Align::decimal);
  table.column("Z", "ohm", Align::decimal);
  table.column("at", "deg", Align::decimal);
  table.column("infeed", "", Align::decimal);
  const RelayRow* last = nullptr;
  for (const Group& g : groups_of(rows)) {
    const RelayRow& row = *g.largest;
    const bool again = last != nullptr && last->place == row.place && last->place_bus == row.place_bus;
    last = &row;
    std::vector<std::string> cells{
        again ? "" : place_name(row.place), again ? "" : n.bus(row.place_bus).id,
        fault_short_name(row.kind),         readable(largest_phase(row.primary.current_ka)),
        state_name(n, row.state),           readable(largest_phase(g.smallest->primary.current_ka)),
        state_name(n, g.smallest->state)};
    const bool earth = is_earth_fault(row.kind);
    cells.push_back(earth ? readable(g.least_residual_ka) : "-");
    cells.push_back(earth ? readable(g.most_residual_ka) : "-");
    const auto* intact = g.intact;
    const auto loop = intact != nullptr ? faulted_loop(*intact) : std::nullopt;
    const bool measures = loop && std::abs(*loop) > 1e-9;
    cells.push_back(loop ? readable(measures ? std::abs(*loop) : 0) : "-");
    std::string angle = "-";
    if (measures) {
      angle.clear();
      append_fixed(angle, degrees(*loop), 1);
    }
    cells.push_back(angle);
    cells.push_back(intact != nullptr && intact->infeed_factor ? readable(*intact->infeed_factor) : "-");
    table.row(std::move(cells));
  }
  return out + table.text();
}

std::string csv_header() {
  std::string out = "relay,bus,branch,fault_place,fault_bus,fault,state";
  for (const char* name : {"ia", "ib", "ic", "i1", "i2", "3i0"})
    out += std::string(",") + name + "_ka," + name + "_deg";
  for (const char* name : {"va", "vb", "vc", "v1", "v2", "3v0", "memory"})
    out += std::string(",") + name + "_kv," + name + "_deg";
  for (const char* name : {"ia", "ib", "ic", "3i0"}) out += std::string(",") + name + "_secondary_a";
  for (const char* name : {"va", "vb", "vc", "3v0"}) out += std::string(",") + name + "_secondary_v";
  for (const char* name : {"ab", "bc", "ca", "a", "b", "c"})
    out += std::string(",r_") + name + "_ohm,x_" + name + "_ohm";
  return out +
         ",secondary_per_primary_ohm,direction,infeed_factor,earth_share,fault_current_ka,fault_3i0_ka\r\n";
}

void append_csv(std::string& out, const Network& n, const RelayLocation& l, const RelayRow& row) {
  const auto amount = [&](double value) {
    out += ',';
    append_fixed(out, value, kAmount);
  };
  const auto optional = [&](const std::optional<double>& value) {
    out += ',';
    if (value) append_fixed(out, *value, kAmount);
  };
  const auto phasor = [&](Complex value) {
    amount(std::abs(value));
    out += ',';
    append_fixed(out, degrees(value), kAngle);
  };
  out += (l.relay ? csv_field(element(n, *l.relay).id) : std::string()) + ',' + csv_field(n.bus(l.bus).id) +
         ',' + csv_field(element(n, l.branch).id) + ',' + place_name(row.place) + ',' +
         csv_field(n.bus(row.place_bus).id) + ',' + fault_name(row.kind) + ',' +
         csv_field(state_name(n, row.state));
  const auto currents = to_phases(row.primary.current_ka), voltages = to_phases(row.primary.voltage_kv);
  const Complex residual_ka = 3.0 * row.primary.current_ka[kZero],
                residual_kv = 3.0 * row.primary.voltage_kv[kZero];
  for (const Complex i : currents) phasor(i);
  phasor(row.primary.current_ka[kPositive]);
  phasor(row.primary.current_ka[kNegative]);
  phasor(residual_ka);
  for (const Complex v : voltages) phasor(v);
  phasor(row.primary.voltage_kv[kPositive]);
  phasor(row.primary.voltage_kv[kNegative]);
  phasor(residual_kv);
  phasor(row.prefault_kv);
  const auto secondary = [&](Complex value, const std::optional<double>& ratio) {
    optional(ratio ? std::optional(1000 * std::abs(value) / *ratio) : std::nullopt);
  };
  for (const Complex i : currents) secondary(i, l.ct_ratio);
  secondary(residual_ka, l.ct_ratio);
  for (const Complex v : voltages) secondary(v, l.vt_ratio);
  secondary(residual_kv, l.vt_ratio);
  for (const auto& z : {row.loops.ab, row.loops.bc, row.loops.ca, row.loops.a, row.loops.b, row.loops.c}) {
    optional(z ? std::optional(z->real()) : std::nullopt);
    optional(z ? std::optional(z->imag()) : std::nullopt);
  }
  optional(l.ct_ratio && l.vt_ratio ? std::optional(*l.ct_ratio / *l.vt_ratio) : std::nullopt);
  out += row.direction ? (*row.direction == Direction::forward ? ",forward" : ",reverse") : ",";
  optional(row.infeed_factor);
  optional(row.earth_share);
  amount(largest_phase(row.fault_ka));
  amount(3 * std::abs(row.fault_ka[kZero]));
  out += "\r\n";
}

class JsonLocation {
 public:
  JsonLocation(const Network& network, const RelayStudy& study) : n(network), study_(study) {}

  std::string of(const RelayLocation& l, std::span<const RelayRow> rows) {
    out = "{\"relay\": " + (l.relay ? json_text(element(n, *l.relay).id) : "null") +
          ", \"bus\": " + json_text(n.bus(l.bus).id) + ", \"branch\": " + json_text(element(n, l.branch).id);
    append_member(out, "ct_ratio", l.ct_ratio);
    append_member(out, "vt_ratio", l.vt_ratio);
    const Complex k0 = residual_compensation_of(study_.intact(), l.branch);
    out += ", \"k0\": ";
    polar(k0);
    out += ",\n \"extremes\": [";
    const char* gap = "\n  ";
    for (const Group& g : groups_of(rows)) {
      out += gap + place(*g.largest) + ", \"largest_ka\": ";
      append_shortest(out, largest_phase(g.largest->primary.current_ka));
      out += ", \"largest_state\": " + json_text(state_name(n, g.largest->state)) + ", \"smallest_ka\": ";
      append_shortest(out, largest_phase(g.smallest->primary.current_ka));
      out += ", \"smallest_state\": " + json_text(state_name(n, g.smallest->state)) + "}";
      gap = ",\n  ";
    }
    out += "],\n \"rows\": [";
    gap = "\n  ";
    for (const RelayRow& row : rows) {
      out += gap;
      one(row);
      gap = ",\n  ";
    }
    return out + "]}";
  }

 private:
  std::string place(const RelayRow& row) const {
    return std::string("{\"place\": \"") + place_name(row.place) +
           "\", \"fault_bus\": " + json_text(n.bus(row.place_bus).id) + ", \"fault\": \"" +
           fault_name(row.kind) + "\"";
  }
  void one(const RelayRow& row) {
    out += place(row) + ", \"state\": " + json_text(state_name(n, row.state));
    phasors("current_ka", row.primary.current_ka);
    phasors("voltage_kv", row.primary.voltage_kv);
    out += ", \"memory_kv\": ";
    polar(row.prefault_kv);
    out += ", \"loops_ohm\": {";
    const char* gap = "";
    for (const auto& [name, z] :
         {std::pair("ab", &row.loops.ab), std::pair("bc", &row.loops.bc), std::pair("ca", &row.loops.ca),
          std::pair("a", &row.loops.a), std::pair("b", &row.loops.b), std::pair("c", &row.loops.c)}) {
      out += gap + std::string("\"") + name + "\": ";
      if (*z) {
        out += '[';
        append_shortest(out, (*z)->real());
        out += ", ";
        append_shortest(out, (*z)->imag());
        out += ']';
      } else {
        out += "null";
      }
      gap = ", ";
    }
    out += std::string("}, \"direction\": ") +
           (row.direction ? (*row.direction == Direction::forward ? "\"forward\"" : "\"reverse\"") : "null");
    append_member(out, "infeed_factor", row.infeed_factor);
    append_member(out, "earth_share", row.earth_share);
    phasors("fault_ka", row.fault_ka);
    out += '}';
  }
  void phasors(const char* name, const BySequence<Complex>& sequence) {
    const auto phases = to_phases(sequence);
    const char* gap = ": {";
    out += std::string(", \"") + name + "\"";
    for (const auto& [label, value] :
         {std::pair("a", phases[0]), std::pair("b", phases[1]), std::pair("c", phases[2]),
          std::pair("1", sequence[1]), std::pair("2", sequence[2]), std::pair("3x0", 3.0 * sequence[0])}) {
      out += gap + std::string("\"") + label + "\": ";
      polar(value);
      gap = ", ";
    }
    out += '}';
  }
  void polar(Complex value) {
    out += '[';
    append_shortest(out, std::abs(value));
    out += ", ";
    append_shortest(out, degrees(value));
    out += ']';
  }

  const Network& n;
  const RelayStudy& study_;
  std::string out;
};

}  // namespace

std::string RelayReport::begin() const {
  const Study& study = study_.intact();
  if (format_ == RelayFormat::csv) return csv_header();
  const auto& left_out = study_.locations().left_out;
  if (format_ == RelayFormat::json) {
    std::string out = json_heading({&study}, facts_) + "\"left_out\": [";
    for (std::size_t i = 0; i < left_out.size(); ++i) out += (i > 0 ? ", " : "") + json_text(left_out[i]);
    return out + "],\n\"locations\": [";
  }
  std::string out = heading_block({&study}, facts_);
  out += paragraph(
      "states       ",
      "intact; each element at the relay's bus and at the remote bus out; the strongest source out; coupled "
      "lines out and earthed at both ends; sources at minimum; scenarios of the case");
  out += paragraph(
      "measured     ",
      "primary current from the bus into the branch, largest phase; 3I0 smallest to largest over the "
      "states; Z of the faulted loop (bc, or a with k0 3I0) and infeed (fault current over the relay's) in "
      "the intact network. CSV and JSON have every state with all phasors, loops and secondary values");
  for (const std::string& text : left_out) out += paragraph("left out     ", text);
  if (study_.locations().list.empty())
    out += paragraph("locations    ",
                     "none: the case has no relay on a branch in service; --everywhere takes every terminal");
  return out;
}

std::string RelayReport::location(std::size_t index, std::span<const RelayRow> rows) const {
  const RelayLocation& l = study_.locations().list[index];
  const Network& n = study_.intact().network();
  if (format_ == RelayFormat::text) return text_location(study_, l, rows);
  if (format_ == RelayFormat::json) return (index > 0 ? ",\n" : "\n") + JsonLocation(n, study_).of(l, rows);
  std::string out;
  for (const RelayRow& row : rows) append_csv(out, n, l, row);
  return out;
}

std::string RelayReport::end() const {
  if (format_ == RelayFormat::text) return "\n" + cautions_block();
  return format_ == RelayFormat::json ? "\n]\n}\n" : "";
}

}  // namespace kiloamp
