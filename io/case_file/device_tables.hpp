// Field tables of devices; table() in field_table.hpp hands them out.
#pragma once
#include "io/case_file/field_table.hpp"

namespace kiloamp::case_file {

[[nodiscard]] Table breakers_table();
[[nodiscard]] Table fuses_table();
[[nodiscard]] Table switchboards_table();
[[nodiscard]] Table relays_table();

}  // namespace kiloamp::case_file
