#include "tests/support/case_study.hpp"

#include "io/case_file/case_reader.hpp"

namespace kiloamp::test {

namespace {

Network taken(ReadResult&& result) {
  std::string text;
  for (const InputError& error : result.errors) text += render(error);
  if (!result.network) throw std::runtime_error("case refused:\n" + text);
  return std::move(*result.network);
}

std::array<Complex, 3> find_current(const std::vector<Contribution>& currents, ElementRef element,
                                    std::optional<BusIndex> bus) {
  for (const Contribution& c : currents)
    if (c.element == element && (!bus || c.bus == *bus)) return to_phases(c.sequence_ka);
  throw std::runtime_error("no such current in the result");
}

}  // namespace

Network read(const std::string& path) {
  return taken(read_case(std::string(KILOAMP_SOURCE_DIR) + "/" + path));
}
Network read_text(const std::string& json) { return taken(read_case_text(json, "test")); }

CaseStudy::CaseStudy(Network network, StudyOptions options) {
  study_ = std::make_unique<Study>(std::move(network), options);
  ids_ = IdTable(study_->network());
}

ElementRef CaseStudy::ref(const std::string& id) const {
  const auto found = ids_.find(study_->network(), id);
  if (!found) throw std::runtime_error("no element " + id + " in the case");
  return *found;
}

BusIndex CaseStudy::bus(const std::string& id) const { return static_cast<BusIndex>(ref(id).index); }

FaultResult CaseStudy::fault(const std::string& id, FaultKind kind, Complex phase_ohm, Complex earth_ohm,
                             int depth) const {
  FaultResult result;
  const auto workspace = study_->solver().make_workspace();
  study_->solver().solve({bus(id), kind, phase_ohm, earth_ohm}, {depth}, *workspace, result);
  return result;
}

std::array<Complex, 3> CaseStudy::current_ka(const FaultResult& result, const std::string& id) const {
  return find_current(result.contributions, ref(id), result.fault.bus);
}
std::array<Complex, 3> CaseStudy::current_ka(const FaultResult& result, const std::string& id,
                                             const std::string& at_bus) const {
  if (bus(at_bus) == result.fault.bus) return current_ka(result, id);
  return find_current(result.branch_currents, ref(id), bus(at_bus));
}

BySequence<Complex> CaseStudy::voltage_kv(const FaultResult& result, const std::string& id) const {
  for (const BusVoltage& v : result.voltages)
    if (v.bus == bus(id)) return v.sequence_kv;
  throw std::runtime_error("no such voltage in the result");
}

}  // namespace kiloamp::test
