// SPDX-License-Identifier: GPL-3.0-or-later
// reporter: one slot between two threads; whatever does not fit into it is merged with what is there.
#include "halfplane/link/reporter.h"

#include <chrono>
#include <cmath>
#include <condition_variable>
#include <mutex>
#include <stdexcept>
#include <thread>

namespace halfplane::link {

/*!
 * Locks, always taken in this order: `life` (start and stop), `stream` (the watch's counting half),
 * `slot_lock` (everything that both threads touch). The worker takes the last alone, and none while it
 * predicts: the watch's reporting half is its own.
 */
struct reporter::impl {
    impl(const signal_set& set, watch_options options, reporter_options how)
        : measured(set, std::move(options)), how(std::move(how))
    {
    }

    /// Under `slot_lock`.
    void put_in_slot(watch::window&& w)
    {
        if (slot) {
            slot->merge(std::move(w));
            ++merged;
        } else {
            slot.emplace(std::move(w));
        }
    }

    void put(watch::window&& w)
    {
        {
            const std::lock_guard held(slot_lock);
            put_in_slot(std::move(w));
        }
        changed.notify_one();
    }

    void work();
    void make_report(watch::window&& w, bool final);
    void note_failure(const char* what)
    {
        const std::lock_guard held(slot_lock);
        ++failures;
        last_failure = what;
    }

    watch measured;
    const reporter_options how;
    link::recent_samples recent; // the worker's own
    std::mutex life, stream;
    std::thread worker;
    bool running = false; // under `life`

    mutable std::mutex slot_lock;
    std::condition_variable changed;
    std::optional<watch::window> slot;
    bool stopping = false;
    std::optional<report> latest;
    std::uint64_t reports = 0, merged = 0, failures = 0;
    std::string last_failure;
};

void reporter::impl::work()
{
    using clock = std::chrono::steady_clock;
    const auto interval =
        std::chrono::duration_cast<clock::duration>(std::chrono::duration<double>(how.least_interval));
    auto due = clock::now();
    while (true) {
        std::optional<watch::window> taken;
        bool final = false;
        {
            std::unique_lock held(slot_lock);
            changed.wait(held, [&] { return slot || stopping; });
            changed.wait_until(held, due, [&] { return stopping; });
            taken.swap(slot);
            final = stopping;
        }
        due = clock::now() + interval;
        if (taken)
            make_report(std::move(*taken), final);
        if (final)
            return;
    }
}

void reporter::impl::make_report(watch::window&& w, bool final)
{
    try {
        recent = std::move(w.recent);
        auto made = measured.report_of(std::move(w), final);
        {
            const std::lock_guard held(slot_lock);
            latest = made;
            ++reports;
        }
        if (how.on_report)
            how.on_report(made);
    } catch (const std::exception& e) {
        note_failure(e.what());
    } catch (...) {
        note_failure("something that is no exception was thrown");
    }
}

reporter::reporter(const signal_set& set, watch_options options, reporter_options how)
{
    // A day is far beyond use and keeps the clock's arithmetic within its range.
    if (!(how.least_interval >= 0 && how.least_interval <= 86400))
        throw std::invalid_argument("least_interval must be 0 to 86400 seconds, got " +
                                    std::to_string(how.least_interval));
    d = std::make_unique<impl>(set, std::move(options), std::move(how));
    start();
}

reporter::~reporter()
{
    stop();
}

void reporter::start()
{
    const std::lock_guard held(d->life);
    if (d->running)
        return;
    d->stopping = false; // no worker yet
    d->worker = std::thread([this] { d->work(); });
    d->running = true;
}

void reporter::stop()
{
    const std::lock_guard alive(d->life);
    if (!d->running)
        return;
    {
        const std::lock_guard counting(d->stream);
        // The last window and the word that it is the last reach the worker together: else it might report
        // the one and, with nothing left to say, miss the other.
        const std::lock_guard held(d->slot_lock);
        d->measured.close([this](watch::window&& w) { d->put_in_slot(std::move(w)); }, true);
        d->stopping = true;
    }
    d->changed.notify_one();
    d->worker.join();
    d->running = false;
}

void reporter::add(const std::complex<float>* in,
                   const reference_t* reference,
                   const std::uint16_t* decided,
                   std::size_t count)
{
    const std::lock_guard held(d->stream);
    d->measured.add(in, reference, decided, count, [this](watch::window&& w) { d->put(std::move(w)); });
}

std::string reporter::carry() const
{
    return d->measured.carry().dump();
}

const std::vector<std::complex<float>>& reporter::recent_samples() const noexcept
{
    return d->recent.samples();
}

void reporter::set_lock(const lock_status& status)
{
    const std::lock_guard held(d->stream);
    d->measured.set_lock(status);
}

void reporter::set_input(const input_snr& input)
{
    const std::lock_guard held(d->stream);
    d->measured.set_input(input);
}

void reporter::set_pending(std::uint64_t pending)
{
    const std::lock_guard held(d->stream);
    d->measured.set_pending(pending);
}

std::optional<report> reporter::latest() const
{
    const std::lock_guard held(d->slot_lock);
    return d->latest;
}

std::uint64_t reporter::reports() const
{
    const std::lock_guard held(d->slot_lock);
    return d->reports;
}

std::uint64_t reporter::merged_windows() const
{
    const std::lock_guard held(d->slot_lock);
    return d->merged;
}

std::uint64_t reporter::failures() const
{
    const std::lock_guard held(d->slot_lock);
    return d->failures;
}

std::string reporter::last_failure() const
{
    const std::lock_guard held(d->slot_lock);
    return d->last_failure;
}

nlohmann::json reporter::settings() const
{
    return d->measured.settings();
}

} // namespace halfplane::link
