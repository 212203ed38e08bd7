// SPDX-License-Identifier: GPL-3.0-or-later
// sha256: the digest that names a link's settings.
#pragma once

#include <string>
#include <string_view>

namespace halfplane::link {

/// SHA-256 (FIPS 180-4) of the bytes, as 64 lower-case hexadecimal digits. For short texts; a library for one
/// hash would weigh more than the hash.
std::string sha256(std::string_view bytes);

} // namespace halfplane::link
