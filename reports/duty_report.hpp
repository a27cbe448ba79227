// Duties of breakers, fuses and switchboards as text, CSV or JSON.
#pragma once
#include "engine/study/duty.hpp"
#include "reports/fault_report.hpp"

namespace kiloamp {

enum class DutyFormat : std::uint8_t { text, csv, json };

/// Text: devices worst first, every check, what is missing, sources, cautions. CSV: one row per device and
/// rating. JSON: one object per device. A check without a verdict carries its reason, never a number.
void write_duty(const Network& network, const DutyTable& table, const DutyOptions& options,
                const ReportFacts& facts, DutyFormat format, const Sink& sink);

}  // namespace kiloamp
