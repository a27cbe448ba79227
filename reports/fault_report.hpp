// A study's faults written as text, CSV or JSON while they are solved.
#pragma once
#include <functional>
#include <memory>
#include <string>

#include "engine/study/cross_check.hpp"
#include "reports/study_words.hpp"

namespace kiloamp {

/// Takes pieces of the report in order.
using Sink = std::function<void(std::string_view)>;

/// What a report says besides the faults.
struct ReportFacts {
  std::string study;           ///< "sweep" or "fault"
  std::string file;            ///< as the user named it
  std::string sha256;          ///< of the case
  std::size_t remarks = 0;     ///< remarks on the data that `check` would show
  bool contributions = false;  ///< text: a table of contributions for every fault
  bool surroundings = false;   ///< text: voltages, branch and neutral currents too
  bool peaks = true;           ///< the study computes peak currents
  bool intermediate = false;   ///< JSON: correction factors, corrected impedances, machines near each fault
};

/// What some faults in a row become in a report, written by one thread.
class ReportPiece {
 public:
  virtual ~ReportPiece() = default;
  virtual void fault(const StudiedFault& fault) = 0;
};

/// begin, then the pieces in the order of their faults, then end. CSV and JSON pass each piece on at once;
/// text keeps the rows of its table.
class FaultReport {
 public:
  virtual ~FaultReport() = default;
  virtual void begin() = 0;
  /// Pieces may be filled on several threads at once.
  [[nodiscard]] virtual std::unique_ptr<ReportPiece> make_piece() const = 0;
  /// Takes what a piece of this report holds and leaves it empty, to be filled again.
  virtual void add(ReportPiece& piece) = 0;
  virtual void end(const CrossCheck* check) = 0;
};

/// Tables of at most 120 columns, with method, state, defaults, warnings and cautions.
[[nodiscard]] std::unique_ptr<FaultReport> text_report(const Studies& studies, const ReportFacts& facts,
                                                       Sink sink);

/// RFC 4180: quotes around a field with a comma, quote or line break; a quote is doubled.
[[nodiscard]] std::string csv_field(const std::string& text);

/// RFC 4180, one header row whose names end in their unit. Currents and impedances with 6 decimals, angles
/// with 3.
enum class CsvTable { faults, contributions };
[[nodiscard]] std::unique_ptr<FaultReport> csv_report(const Studies& studies, CsvTable table, Sink sink);

/// One document, format "kiloamp-results", version 1. A quantity without a value is null, never a made-up
/// number.
[[nodiscard]] std::unique_ptr<FaultReport> json_report(const Studies& studies, const ReportFacts& facts,
                                                       Sink sink);

}  // namespace kiloamp
