#include "reports/check_report.hpp"

#include "reports/text_blocks.hpp"

namespace kiloamp {

std::string check_text(const Study& study, const std::string& file) {
  const Network& n = study.network();
  std::string out = "kiloamp check: " + file + " can be studied\n" +
                    paragraph("case         ", n.title.value_or("untitled"));
  std::string counts;
  for_each_section(n, [&](ElementKind kind, const auto& section) {
    if (section.empty()) return;
    if (!counts.empty()) counts += ", ";
    counts +=
        std::to_string(section.size()) + " " + (section.size() == 1 ? kind_name(kind) : section_name(kind));
  });
  for (char& c : counts)
    if (c == '_') c = ' ';
  out += paragraph("holds        ", counts);
  std::string where[2];
  std::size_t count[2] = {0, 0};
  constexpr std::size_t kNamed = 8;
  for (std::size_t b = 0; b < n.buses.size(); ++b) {
    const Node node = study.model().node_of_bus[b];
    if (node == Node::none) continue;
    const int kind = !study.model().has_source[at(node)]      ? 0
                     : !study.model().has_zero_path[at(node)] ? 1
                                                              : -1;
    if (kind < 0) continue;
    if (count[kind]++ < kNamed) where[kind] += (where[kind].empty() ? "" : ", ") + n.buses[b].id;
  }
  const auto listed = [&](const char* label, int kind) {
    out += paragraph(label, count[kind] == 0 ? "none"
                                             : std::to_string(count[kind]) + ": " + where[kind] +
                                                   (count[kind] > kNamed ? ", ..." : ""));
  };
  listed("no source    ", 0);
  listed("unearthed    ", 1);
  out += defaults_block(n, study.defaults_used());
  const char* label = "warnings     ";
  for (const std::string& warning : study.warnings()) {
    out += paragraph(label, warning);
    label = "             ";
  }
  return out;
}

}  // namespace kiloamp
