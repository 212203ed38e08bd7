// SPDX-License-Identifier: GPL-3.0-or-later
// parallel: the same function of many indices, on all cores.
#pragma once

#include <algorithm>
#include <atomic>
#include <cstddef>
#include <exception>
#include <mutex>
#include <system_error>
#include <thread>
#include <vector>

namespace halfplane::python {

/*!
 * Calls f(k) for k = 0 … count − 1, each once, in any order and from several threads. The first exception
 * ends the work and is thrown here. f must touch no Python object.
 */
template <typename F>
void parallel_for(std::size_t count, F f)
{
    std::atomic<std::size_t> next{0};
    std::exception_ptr failure;
    std::mutex failing;
    const auto work = [&] {
        for (std::size_t k; (k = next++) < count;) {
            try {
                f(k);
            } catch (...) {
                const std::lock_guard<std::mutex> lock(failing);
                if (!failure)
                    failure = std::current_exception();
                next = count;
            }
        }
    };
    const std::size_t cores = std::max(1u, std::thread::hardware_concurrency());
    std::vector<std::thread> helpers;
    try {
        for (std::size_t k = 1; k < std::min(cores, count); ++k)
            helpers.emplace_back(work);
    } catch (const std::system_error&) {
        // No more threads to be had: those there are do the work.
    }
    work();
    for (std::thread& each : helpers)
        each.join();
    if (failure)
        std::rethrow_exception(failure);
}

} // namespace halfplane::python
