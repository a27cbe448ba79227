// What relays measure, as text, CSV or JSON, written location by location.
#pragma once
#include "engine/study/relays.hpp"
#include "reports/fault_report.hpp"

namespace kiloamp {

enum class RelayFormat : std::uint8_t { text, csv, json };

/// begin, then each location's part in order, then end. Parts may be made on several threads.
/// Text: for each location, place and kind of fault the largest and smallest current with the state that
/// gives it, and what the intact network gives. CSV: one row per location, fault and state. JSON: both.
class RelayReport {
 public:
  RelayReport(const RelayStudy& study, ReportFacts facts, RelayFormat format)
      : study_(study), facts_(std::move(facts)), format_(format) {}

  [[nodiscard]] std::string begin() const;
  [[nodiscard]] std::string location(std::size_t index, std::span<const RelayRow> rows) const;
  [[nodiscard]] std::string end() const;

 private:
  const RelayStudy& study_;
  ReportFacts facts_;
  RelayFormat format_;
};

}  // namespace kiloamp
