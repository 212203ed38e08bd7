// SPDX-License-Identifier: GPL-3.0-or-later
// threads: setters and getters from a thread of their own while a flowgraph runs. Under ThreadSanitizer this
// is the proof that nothing is shared unguarded; without it, that nothing stalls or is lost.
#include "halfplane/set_file.h"

#include <gnuradio/halfplane/aligner.h>
#include <gnuradio/halfplane/known_spans.h>
#include <gnuradio/halfplane/link_watch.h>
#include <gnuradio/halfplane/llr_detector.h>
#include <gnuradio/halfplane/noise_at.h>
#include <gnuradio/halfplane/point_detector.h>
#include <gnuradio/halfplane/point_mapper.h>
#include <gnuradio/halfplane/test_pattern.h>

#include <gnuradio/blocks/null_sink.h>
#include <gnuradio/top_block.h>

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <cstdio>
#include <thread>

using namespace gr::halfplane;

TEST(Threads, SettersWhileRunning)
{
    const auto set = halfplane::load_set("qam:16"), other = halfplane::load_set("psk:8");
    const auto graph = gr::make_top_block("threads");
    const auto source = test_pattern::make(set, "draw:1");
    const auto map = point_mapper::make(set);
    const auto noise = noise_at::make(set, 15.0, 1.0, 1);
    const auto align = aligner::make(set, "draw:1");
    const auto watch = link_watch::make(set, "draw:1", 1000);
    const auto detect = point_detector::make(set, "indices");
    const auto soft = llr_detector::make(set, 0.1);
    graph->connect(source, 0, map, 0);
    graph->connect(map, 0, noise, 0);
    graph->connect(noise, 0, align, 0);
    graph->connect(align, 0, watch, 0);
    graph->connect(align, 1, watch, 1);
    graph->connect(noise, 0, detect, 0);
    graph->connect(detect, 0, gr::blocks::null_sink::make(sizeof(std::int16_t)), 0);
    graph->connect(noise, 0, soft, 0);
    graph->connect(soft, 0, gr::blocks::null_sink::make(sizeof(float)), 0);
    graph->msg_connect(noise, "input", watch, "input");

    graph->start();
    const auto judged = [&] {
        const auto text = watch->report();
        return text.empty() ? 0 : nlohmann::json::parse(text).at("total").at("judged").get<std::uint64_t>();
    };
    std::uint64_t turns = 0;
    for (; turns < 300 || judged() < 200000; ++turns) {
        noise->set_es_n0_db(14.0 + 0.1 * static_cast<double>(turns % 10));
        detect->set_n0(0.1 + 0.01 * static_cast<double>(turns % 7));
        soft->set_n0(0.1 + 0.01 * static_cast<double>(turns % 7));
        if (turns % 10 == 0) {
            detect->set_signal_set(turns % 20 ? set : other);
            soft->set_signal_set(set);
        }
        (void)align->state();
        (void)align->slips();
        (void)noise->n0();
        (void)detect->n0();
        (void)soft->n0();
        std::this_thread::yield();
    }
    graph->stop();
    graph->wait();

    const auto total = nlohmann::json::parse(watch->report()).at("total");
    std::printf("%llu turns of the setters, %llu symbols\n",
                static_cast<unsigned long long>(turns),
                total.at("in").get<unsigned long long>());
    std::uint64_t accounted = total.at("judged").get<std::uint64_t>() +
                              total.at("nonfinite").get<std::uint64_t>() +
                              total.at("pending").get<std::uint64_t>();
    for (const auto& cause : total.at("excluded"))
        accounted += cause.get<std::uint64_t>();
    EXPECT_EQ(total.at("in"), accounted);
    EXPECT_EQ(total.at("in").get<std::uint64_t>() - aligner::holdback(), watch->nitems_read(0));
}

TEST(Threads, SpansHandedInWhileRunning)
{
    const auto set = halfplane::load_set("qam:16");
    const auto graph = gr::make_top_block("spans");
    const auto source = test_pattern::make(set, "draw:1");
    const auto map = point_mapper::make(set);
    const auto noise = noise_at::make(set, 15.0, 1.0, 1);
    const auto spans = known_spans::make(set, 4096);
    const auto watch = link_watch::make(set, "draw:1", 1000);
    graph->connect(source, 0, map, 0);
    graph->connect(map, 0, noise, 0);
    graph->connect(noise, 0, spans, 0);
    graph->connect(spans, 0, watch, 0);
    graph->connect(spans, 1, watch, 1);

    const auto data = pmt::make_u8vector(50, 7);
    const auto hand_in = [&](std::uint64_t first_symbol, bool decoded) {
        auto meta = pmt::dict_add(pmt::make_dict(), pmt::mp("first_symbol"), pmt::from_uint64(first_symbol));
        meta = pmt::dict_add(meta, pmt::mp("decoded"), pmt::from_bool(decoded));
        spans->_post(pmt::mp("known"), pmt::cons(meta, data));
    };
    hand_in(0, false); // before the start, so never late
    std::uint64_t handed = 1;
    graph->start();
    for (auto counts = spans->counts(); counts.spans < 2000 || counts.known == 0 || watch->report().empty();
         counts = spans->counts()) {
        if (handed < 2000)
            hand_in(counts.live + 20000 + 100 * (handed % 100), handed % 2);
        handed += handed < 2000;
        std::this_thread::yield();
    }
    graph->stop();
    graph->wait();

    const auto counts = spans->counts();
    const auto total = nlohmann::json::parse(watch->report()).at("total");
    EXPECT_EQ(counts.spans, handed);
    EXPECT_EQ(counts.conflicts, 0u); // all say the same
    EXPECT_EQ(spans->refused(), 0u);
    EXPECT_GE(counts.known, 50u);
    EXPECT_EQ(counts.known + counts.decoded + counts.live, spans->nitems_written(0));
    EXPECT_LE(watch->nitems_read(0), spans->nitems_written(0));
    EXPECT_EQ(total.at("judged").get<std::uint64_t>() + total.value("decoded", std::uint64_t{0}) +
                  total.at("live").get<std::uint64_t>(),
              watch->nitems_read(0));
}
