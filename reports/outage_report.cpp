#include "reports/outage_report.hpp"

#include "reports/json_parts.hpp"
#include "reports/number_text.hpp"
#include "reports/study_words.hpp"
#include "reports/text_blocks.hpp"
#include "reports/text_table.hpp"

namespace kiloamp {

namespace {

constexpr std::size_t kFlushAt = 1 << 16;
constexpr std::size_t kNamedBuses = 6;

std::string id(const Study& study, ElementRef ref) { return element(study.network(), ref).id; }
std::string bus_id(const Study& study, BusIndex bus) { return study.network().bus(bus).id; }

std::string some_buses(const Study& study, const std::vector<BusIndex>& buses) {
  std::string text = std::to_string(buses.size()) + " (";
  for (std::size_t i = 0; i < buses.size() && i < kNamedBuses; ++i)
    text += (i > 0 ? ", " : "") + bus_id(study, buses[i]);
  return text + (buses.size() > kNamedBuses ? ", ...)" : ")");
}

void write_text(const Study& study, const OutageTable& table, const ReportFacts& facts, const Sink& sink) {
  sink(heading_block({&study}, facts));
  sink(paragraph("outages      ",
                 std::to_string(table.outages) +
                     " elements, each out alone; currents by change of low rank, no new factorisation") +
       "\n");
  TextTable text;
  text.column("bus", "", TextTable::Align::left);
  text.column("nominal", "kV", TextTable::Align::decimal);
  text.column("fault", "", TextTable::Align::left);
  text.column("intact", "kA", TextTable::Align::decimal);
  text.column("largest", "kA", TextTable::Align::decimal);
  text.column("with this out", "", TextTable::Align::left);
  text.column("smallest", "kA", TextTable::Align::decimal);
  text.column("with this out", "", TextTable::Align::left);
  const auto outage = [&](const OutageExtreme& e) {
    return e.outage ? id(study, *e.outage) : std::string("intact");
  };
  for (const OutageRow& row : table.rows) {
    const bool first = row.kind == FaultKind::three_phase;
    text.row({first ? bus_id(study, row.bus) : "",
              first ? readable(study.network().bus(row.bus).nominal_kv) : "", fault_short_name(row.kind),
              readable(row.intact_ka), readable(row.largest.current_ka), outage(row.largest),
              readable(row.smallest.current_ka), outage(row.smallest)});
  }
  sink(text.text());
  if (text.was_shortened())
    sink("Long names are shortened in the middle (…); CSV and JSON carry them whole.\n");
  sink("\nOutages that split the network: " + std::to_string(table.splits.size()) + "\n");
  for (const OutageSplit& split : table.splits) {
    std::string words;
    if (!split.without_source.empty()) words = "no source at " + some_buses(study, split.without_source);
    if (!split.without_earth_path.empty())
      words += (words.empty() ? "" : "; ") + std::string("no earth path at ") +
               some_buses(study, split.without_earth_path);
    sink(paragraph("  " + id(study, split.outage) + ": ", words));
  }
  sink("\n" + cautions_block());
}

void write_csv(const Study& study, const OutageTable& table, const Sink& sink) {
  std::string out =
      "bus,nominal_kv,fault,intact_ka,largest_ka,largest_outage,smallest_ka,smallest_outage\r\n";
  constexpr int kDecimals = 6;
  for (const OutageRow& row : table.rows) {
    out += csv_field(bus_id(study, row.bus)) + ',';
    append_fixed(out, study.network().bus(row.bus).nominal_kv, kDecimals);
    out += std::string(",") + fault_name(row.kind) + ',';
    append_fixed(out, row.intact_ka, kDecimals);
    for (const OutageExtreme* e : {&row.largest, &row.smallest}) {
      out += ',';
      append_fixed(out, e->current_ka, kDecimals);
      out += ',' + (e->outage ? csv_field(id(study, *e->outage)) : std::string());
    }
    out += "\r\n";
    if (out.size() > kFlushAt) {
      sink(out);
      out.clear();
    }
  }
  sink(out);
}

void write_json(const Study& study, const OutageTable& table, const ReportFacts& facts, const Sink& sink) {
  std::string out =
      json_heading({&study}, facts) + "\"outages\": " + std::to_string(table.outages) + ",\n\"buses\": [";
  const char* gap = "\n";
  for (const OutageRow& row : table.rows) {
    out += gap + std::string("{\"bus\": ") + json_text(bus_id(study, row.bus)) + ", \"fault\": \"" +
           fault_name(row.kind) + "\", \"intact_ka\": ";
    append_shortest(out, row.intact_ka);
    const char* names[] = {"largest", "smallest"};
    int which = 0;
    for (const OutageExtreme* e : {&row.largest, &row.smallest}) {
      const std::string name = names[which++];
      out += ", \"" + name + "_ka\": ";
      append_shortest(out, e->current_ka);
      out += ", \"" + name + "_outage\": " + (e->outage ? json_text(id(study, *e->outage)) : "null");
    }
    out += '}';
    gap = ",\n";
    if (out.size() > kFlushAt) {
      sink(out);
      out.clear();
    }
  }
  out += "\n],\n\"splits\": [";
  gap = "\n";
  for (const OutageSplit& split : table.splits) {
    const auto list = [&](const std::vector<BusIndex>& buses) {
      std::string text = "[";
      for (std::size_t i = 0; i < buses.size(); ++i)
        text += (i > 0 ? ", " : "") + json_text(bus_id(study, buses[i]));
      return text + "]";
    };
    out += gap + std::string("{\"outage\": ") + json_text(id(study, split.outage)) +
           ", \"without_source\": " + list(split.without_source) +
           ", \"without_earth_path\": " + list(split.without_earth_path) + "}";
    gap = ",\n";
  }
  sink(out + "\n]\n}\n");
}

}  // namespace

void write_outages(const Study& study, const OutageTable& table, const ReportFacts& facts,
                   OutageFormat format, const Sink& sink) {
  if (format == OutageFormat::csv)
    write_csv(study, table, sink);
  else if (format == OutageFormat::json)
    write_json(study, table, facts, sink);
  else
    write_text(study, table, facts, sink);
}

}  // namespace kiloamp
