// SPDX-License-Identifier: GPL-3.0-or-later
// target: which instruction set the hot loops run on. Chosen at start; results do not depend on it.
#pragma once

#include <string>
#include <vector>

namespace halfplane::kernels {

/// Instruction sets that are compiled in and that this processor has, the plainest first ("baseline", "v2",
/// "v3", "v4": the levels of the x86-64 psABI; "baseline" alone on other machines).
std::vector<std::string> usable_targets();
/// The one in use, from the start the last of usable_targets().
std::string target();
/// Switches the whole process, for tests and comparisons. \throws std::invalid_argument where not usable
void use_target(const std::string& name);

} // namespace halfplane::kernels
