// Faults of a case file, for tests that compare single numbers.
#pragma once
#include <memory>
#include <string>

#include "engine/network/id_table.hpp"
#include "engine/study/duty.hpp"

namespace kiloamp::test {

/// Reads a case below the source folder; a case with errors fails the test at once, with their text.
[[nodiscard]] Network read(const std::string& path_below_source);
[[nodiscard]] Network read_text(const std::string& json);

/// A study of a case and its faults by bus id.
class CaseStudy {
 public:
  explicit CaseStudy(Network network, StudyOptions options = {});

  [[nodiscard]] const Study& study() const { return *study_; }
  [[nodiscard]] BusIndex bus(const std::string& id) const;
  [[nodiscard]] FaultResult fault(const std::string& bus, FaultKind kind, Complex phase_ohm = 0,
                                  Complex earth_ohm = 0, int depth = 10) const;
  /// Current from the element into the faulted bus, or into `bus` when that is another within the depth;
  /// phases a, b, c in kA.
  [[nodiscard]] std::array<Complex, 3> current_ka(const FaultResult& result,
                                                  const std::string& element_id) const;
  [[nodiscard]] std::array<Complex, 3> current_ka(const FaultResult& result, const std::string& element_id,
                                                  const std::string& bus) const;
  [[nodiscard]] BySequence<Complex> voltage_kv(const FaultResult& result, const std::string& bus) const;

 private:
  [[nodiscard]] ElementRef ref(const std::string& id) const;

  std::unique_ptr<Study> study_;
  IdTable ids_;
};

}  // namespace kiloamp::test
