// The table of single outages as text, CSV or JSON.
#pragma once
#include "engine/study/outages.hpp"
#include "reports/fault_report.hpp"

namespace kiloamp {

enum class OutageFormat { text, csv, json };

/// One row per bus and kind of fault: intact, largest and smallest current, each extreme with the outage that
/// governs it; then the outages that split the network. CSV holds the rows alone.
void write_outages(const Study& study, const OutageTable& table, const ReportFacts& facts,
                   OutageFormat format, const Sink& sink);

}  // namespace kiloamp
