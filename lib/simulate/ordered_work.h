// SPDX-License-Identifier: GPL-3.0-or-later
// ordered_work: pieces of work made on several threads and taken in their order on one.
#pragma once

#include <chrono>
#include <condition_variable>
#include <cstdint>
#include <exception>
#include <map>
#include <mutex>
#include <thread>
#include <utility>
#include <vector>

namespace halfplane {

/*!
 * Makes pieces 0, 1, … `pieces` − 1 on `threads` workers and hands them, in this order, to `take` on the
 * calling thread. What is taken therefore does not depend on the number of threads. Workers run ahead by a
 * few pieces a thread at most; what they made beyond the end is thrown away.
 *
 * \param make  (piece) → result, called on the workers
 * \param take  (result&&) → bool, false: no more
 * \param watch () → bool, called about ten times a second while waiting and after pieces; false: stop here
 * \returns false where `watch` said so
 * An exception from `make` ends the work and is thrown again here.
 */
template <typename Result, typename Make, typename Take, typename Watch>
bool run_in_order(
    unsigned threads, std::uint64_t pieces, const Make& make, const Take& take, const Watch& watch)
{
    std::mutex lock;
    std::condition_variable room, ready;
    std::map<std::uint64_t, Result> made;
    std::uint64_t next_made = 0, next_taken = 0;
    bool stop = false;
    std::exception_ptr failure;
    const std::uint64_t ahead = 4 * std::uint64_t{threads};

    const auto work = [&] {
        std::unique_lock<std::mutex> hold(lock);
        for (;;) {
            room.wait(hold, [&] { return stop || next_made >= pieces || next_made < next_taken + ahead; });
            if (stop || next_made >= pieces)
                return;
            const std::uint64_t piece = next_made++;
            hold.unlock();
            try {
                Result result = make(piece);
                hold.lock();
                made.emplace(piece, std::move(result));
            } catch (...) {
                hold.lock();
                failure = std::current_exception();
                stop = true;
                room.notify_all();
            }
            ready.notify_one();
        }
    };
    std::vector<std::thread> workers;
    const auto finish = [&] {
        {
            const std::lock_guard<std::mutex> hold(lock);
            stop = true;
        }
        room.notify_all();
        for (std::thread& worker : workers)
            worker.join();
    };
    bool willing = true;
    try {
        for (unsigned t = 0; t < threads; ++t)
            workers.emplace_back(work);
        constexpr std::chrono::milliseconds pause(100);
        auto last_watch = std::chrono::steady_clock::now();
        std::unique_lock<std::mutex> hold(lock);
        while (willing && next_taken < pieces && !failure) {
            ready.wait_for(hold, pause, [&] { return failure || made.count(next_taken); });
            bool more = true;
            while (more && !failure && made.count(next_taken)) {
                auto node = made.extract(next_taken);
                hold.unlock();
                more = take(std::move(node.mapped()));
                hold.lock();
                ++next_taken;
                room.notify_one();
            }
            if (!more)
                break;
            const auto now = std::chrono::steady_clock::now();
            if (now - last_watch >= pause) {
                last_watch = now;
                hold.unlock();
                willing = watch();
                hold.lock();
            }
        }
    } catch (...) {
        finish();
        throw;
    }
    finish();
    if (failure)
        std::rethrow_exception(failure);
    return willing;
}

} // namespace halfplane
