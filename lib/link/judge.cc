// SPDX-License-Identifier: GPL-3.0-or-later
// judge: reads, aligns and counts on the caller's thread, predicts and reports on another.
#include "halfplane/link/judge.h"

#include <algorithm>
#include <chrono>
#include <condition_variable>
#include <deque>
#include <exception>
#include <mutex>
#include <thread>
#include <utility>
#include <vector>

namespace halfplane::link {

namespace {

constexpr std::size_t piece = 16384;

/*!
 * Calls `report_window` for each window in order on its own thread. put() waits where that falls far behind:
 * nothing is merged and memory stays bounded. The latest window waits for the word whether it is the last.
 */
class report_line
{
public:
    using handler = std::function<void(watch::window&&, bool final)>;

    explicit report_line(handler report_window)
        : d_report(std::move(report_window)), d_worker([this] { work(); })
    {
    }

    ~report_line()
    {
        if (!d_worker.joinable())
            return;
        {
            const std::lock_guard held(d_lock);
            d_windows.clear();
            d_ended = true;
        }
        d_changed.notify_all();
        d_worker.join();
    }

    /// \throws what the handler threw
    void put(watch::window&& w)
    {
        std::unique_lock held(d_lock);
        d_changed.wait(held, [&] { return d_windows.size() < most_waiting || d_failure; });
        if (d_failure)
            std::rethrow_exception(d_failure);
        d_windows.push_back(std::move(w));
        held.unlock();
        d_changed.notify_all();
    }

    /// What was put last was the last.
    void finish()
    {
        {
            const std::lock_guard held(d_lock);
            d_ended = true;
        }
        d_changed.notify_all();
        d_worker.join();
        if (d_failure)
            std::rethrow_exception(d_failure);
    }

private:
    static constexpr std::size_t most_waiting = 4;

    void work()
    {
        std::unique_lock held(d_lock);
        while (true) {
            d_changed.wait(held, [&] { return d_ended || d_windows.size() > 1; });
            if (d_windows.empty())
                return;
            auto w = std::move(d_windows.front());
            d_windows.pop_front();
            const bool final = d_ended && d_windows.empty();
            held.unlock();
            d_changed.notify_all();
            try {
                d_report(std::move(w), final);
            } catch (...) {
                held.lock();
                d_failure = std::current_exception();
                d_changed.notify_all();
                return;
            }
            held.lock();
        }
    }

    handler d_report;
    std::mutex d_lock;
    std::condition_variable d_changed;
    std::deque<watch::window> d_windows;
    bool d_ended = false;
    std::exception_ptr d_failure;
    std::thread d_worker; // the last: it uses all others
};

/// The counting side: what the aligner gives, handed to the watch with its changes of lock in place.
struct counter {
    counter(const signal_set& set, const pattern& known, const judge_options& options, watch& measured)
        : align(set, known, options.align), measured(measured), window(options.watch.window)
    {
    }

    void take(const std::complex<float>* in, std::size_t count)
    {
        hand_over(align.process(in, count, samples.data(), reference.data()));
    }

    void finish() { hand_over(align.finish(samples.data(), reference.data())); }

    void hand_over(std::size_t count)
    {
        for (auto& event : align.take_events())
            events.push_back(event);
        for (std::size_t k = 0; k < count;) {
            const std::uint64_t handed = measured.handed_in();
            while (!events.empty() && events.front().symbol <= handed) {
                measured.set_lock(events.front().status);
                events.pop_front();
            }
            // Cut where a window closes, so that what it calls pending is so to the symbol.
            std::uint64_t n = std::min<std::uint64_t>(count - k, window - handed % window);
            if (!events.empty())
                n = std::min(n, events.front().symbol - handed);
            measured.set_pending(align.taken() - handed - n);
            measured.add(&samples[k], &reference[k], nullptr, static_cast<std::size_t>(n), on_window);
            k += static_cast<std::size_t>(n);
        }
    }

    aligner align;
    watch& measured;
    const std::uint64_t window;
    watch::window_handler on_window;
    std::deque<lock_event> events;
    std::vector<std::complex<float>> samples = std::vector<std::complex<float>>(piece);
    std::vector<reference_t> reference = std::vector<reference_t>(piece);
};

static_assert(piece >= aligner::holdback);

class ticker
{
public:
    bool due()
    {
        const auto now = std::chrono::steady_clock::now();
        if (now < d_next)
            return false;
        d_next = now + std::chrono::milliseconds(100);
        return true;
    }

private:
    std::chrono::steady_clock::time_point d_next{};
};

} // namespace

std::uint64_t window_for(std::uint64_t samples) noexcept
{
    return std::max<std::uint64_t>(10000, (samples + 49) / 50);
}

judgement judge(recording& from, const signal_set& set, const pattern& known, judge_options options)
{
    if (options.watch.symbol_rate == 0)
        options.watch.symbol_rate = from.sample_rate();
    // Of the last symbol of the window that is being reported; of the reporting thread alone.
    std::uint64_t reported = from.position();
    options.watch.clock = [&] { return from.time_of(reported > 0 ? reported - 1 : 0); };
    watch measured(set, options.watch);
    if (options.input)
        measured.set_input(*options.input);
    counter counting(set, known, options, measured);

    judgement result;
    result.settings = measured.settings();
    report_line line([&](watch::window&& w, bool final) {
        reported += w.counts.accounted();
        auto made = measured.report_of(std::move(w), final);
        if (options.on_report)
            options.on_report(made, result.settings);
        if (final)
            result.last = std::move(made);
    });
    counting.on_window = [&](watch::window&& w) { line.put(std::move(w)); };

    ticker tick;
    std::vector<std::complex<float>> samples(piece);
    std::size_t capture = 0;
    while (true) {
        if (options.progress && tick.due() && !options.progress(from.position())) {
            result.complete = false;
            break;
        }
        while (capture < from.captures().size() && from.captures()[capture].first <= from.position()) {
            const auto& begins = from.captures()[capture++];
            if (begins.gap && begins.first == from.position())
                counting.align.mark_overflow();
        }
        const std::size_t count = from.read(samples.data(), samples.size());
        if (count == 0)
            break;
        counting.take(samples.data(), count);
    }
    counting.finish();
    for (const auto& event : counting.events)
        measured.set_lock(event.status);
    const bool nothing = measured.handed_in() == 0;
    measured.close(counting.on_window, nothing);
    line.finish();
    if (options.progress && result.complete)
        options.progress(from.position());
    return result;
}

} // namespace halfplane::link
