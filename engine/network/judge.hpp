// The parts of judge(): one function per family of elements.
#pragma once
#include "engine/network/finding.hpp"

namespace kiloamp::detail {

/// Collects findings about one network.
class Findings {
 public:
  Findings(const Network& network, const std::function<bool(ElementRef)>& skip)
      : network_(network), skip_(skip) {}
  /// False for an element that is not to be judged.
  [[nodiscard]] bool judges(ElementRef ref) const { return !skip_ || !skip_(ref); }
  [[nodiscard]] const Network& network() const { return network_; }

  void error(ElementRef ref, std::string field, std::string found, std::string allowed, std::string remedy) {
    list_.push_back(
        {Severity::error, ref, std::move(field), std::move(found), std::move(allowed), std::move(remedy)});
  }
  void remark(ElementRef ref, std::string field, std::string found, std::string allowed, std::string remedy) {
    list_.push_back(
        {Severity::remark, ref, std::move(field), std::move(found), std::move(allowed), std::move(remedy)});
  }
  [[nodiscard]] std::vector<Finding> take() { return std::move(list_); }

 private:
  const Network& network_;
  const std::function<bool(ElementRef)>& skip_;
  std::vector<Finding> list_;
};

[[nodiscard]] std::string number_text(double value);
/// Neutral data against the winding; rated voltage against the bus.
void judge_winding(Findings& out, ElementRef ref, const char* field, const std::optional<Neutral>& neutral,
                   Winding winding, const std::string& name);
void judge_rated_voltage(Findings& out, ElementRef ref, const char* field, double rated_kv, BusIndex bus);

void judge_transformers(Findings& out);
void judge_devices(Findings& out);
/// Remarks: values outside the usual range.
void judge_ranges(Findings& out);

}  // namespace kiloamp::detail
