// SHA-256, to tie results to the bytes of the case they came from.
#pragma once
#include <string>
#include <string_view>

namespace kiloamp {

/// Lower-case hexadecimal digest. Source: FIPS 180-4.
[[nodiscard]] std::string sha256(std::string_view bytes);

}  // namespace kiloamp
