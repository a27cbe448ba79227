// Numbers as text: fast fixed decimals for tables, shortest round trip for JSON.
#pragma once
#include <string>

namespace kiloamp {

/// `decimals` digits behind the point (0 to 9), half away from zero on the binary value; "-0" is written "0".
/// Values from 1e9 on go through the general formatter. NaN and infinity leave the cell empty.
void append_fixed(std::string& out, double value, int decimals);

/// Shortest text that reads back as the same double; "null" for NaN and infinity.
void append_shortest(std::string& out, double value);

/// About four significant digits with the decimals that takes (1 to 6), so that 0.0004 is not shown as 0.000;
/// a smaller non-zero value in scientific form.
[[nodiscard]] std::string readable(double value);

}  // namespace kiloamp
