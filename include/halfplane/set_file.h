// SPDX-License-Identifier: GPL-3.0-or-later
// set_file: constellations by name or from disk; the one way in which a SET argument becomes a signal_set.
#pragma once

#include "halfplane/signal_set.h"

#include <iosfwd>
#include <string>
#include <vector>

namespace halfplane {

/*!
 * What a user writes where a constellation is asked for: a named family (`psk:8`, `apsk:4+12:2.85`), a
 * standard one (`std:38.211/16qam`), or the path of a set file (JSON or CSV).
 * \throws invalid_set with file, line or index, field and value of what is refused
 */
signal_set load_set(const std::string& what);

/// A named family or `std:` constellation only. \throws invalid_set naming the closest known name
signal_set named_set(const std::string& name);

/// Set files. `source` is the name that error messages use for the stream.
signal_set read_set_json(std::istream& in, const std::string& source);
signal_set read_set_csv(std::istream& in, const std::string& source);
/// JSON that read_set_json reads back to the very same doubles.
void write_set_json(std::ostream& out, const signal_set& set);
void write_set_csv(std::ostream& out, const signal_set& set);

struct named_set_entry {
    std::string name;   ///< what to write as SET; families with an example of their parameters
    std::string about;  ///< one line
    std::string source; ///< document and clause for `std:`, "own table" otherwise; says so where it stands
                        ///< from memory
};
/// Everything named_set() knows, in listing order.
const std::vector<named_set_entry>& named_sets();

} // namespace halfplane
