// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/kernels/target.h"

#include "loops.h"

#include <atomic>
#include <stdexcept>

namespace halfplane::kernels {

namespace baseline {
extern const loop_table table;
}
#ifdef HALFPLANE_X86_TARGETS
namespace v2 {
extern const loop_table table;
}
namespace v3 {
extern const loop_table table;
}
namespace v4 {
extern const loop_table table;
}
#endif

const std::vector<const loop_table*>& usable_loops()
{
    static const std::vector<const loop_table*> usable = [] {
        std::vector<const loop_table*> found{&baseline::table};
#ifdef HALFPLANE_X86_TARGETS
        __builtin_cpu_init();
        const bool has_v2 = __builtin_cpu_supports("sse4.2") && __builtin_cpu_supports("ssse3") &&
                            __builtin_cpu_supports("popcnt");
        const bool has_v3 = has_v2 && __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma") &&
                            __builtin_cpu_supports("bmi") && __builtin_cpu_supports("bmi2");
        const bool has_v4 = has_v3 && __builtin_cpu_supports("avx512f") &&
                            __builtin_cpu_supports("avx512bw") && __builtin_cpu_supports("avx512cd") &&
                            __builtin_cpu_supports("avx512dq") && __builtin_cpu_supports("avx512vl");
        if (has_v2)
            found.push_back(&v2::table);
        if (has_v3)
            found.push_back(&v3::table);
        if (has_v4)
            found.push_back(&v4::table);
#endif
        return found;
    }();
    return usable;
}

namespace {
std::atomic<const loop_table*> chosen{nullptr};
}

const loop_table& loops() noexcept
{
    const loop_table* table = chosen.load(std::memory_order_acquire);
    return table ? *table : *usable_loops().back();
}

std::vector<std::string> usable_targets()
{
    std::vector<std::string> names;
    for (const loop_table* table : usable_loops())
        names.emplace_back(table->target);
    return names;
}

std::string target()
{
    return loops().target;
}

void use_target(const std::string& name)
{
    for (const loop_table* table : usable_loops())
        if (name == table->target) {
            chosen.store(table, std::memory_order_release);
            return;
        }
    throw std::invalid_argument("target: \"" + name +
                                "\" is not compiled in or not supported by this processor");
}

} // namespace halfplane::kernels
