// SPDX-License-Identifier: GPL-3.0-or-later
// standard_sets: constellations as published, by document.
#pragma once

#include "halfplane/set_file.h"

#include <functional>
#include <string>
#include <vector>

namespace halfplane::detail {

struct standard_set {
    named_set_entry entry; ///< name with the leading "std:"
    std::function<signal_set()> make;
};

/// Every standard set in listing order; index = label, points scaled as the document scales them.
const std::vector<standard_set>& standard_sets();

} // namespace halfplane::detail
