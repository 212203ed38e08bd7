// SPDX-License-Identifier: GPL-3.0-or-later
// Benchmark: aligner and link_watch in a flowgraph, with reports as often as the watch makes them. Run by
// hand: build/tests/speed/link_speed
#include "halfplane/kernels/noise.h"
#include "halfplane/pattern.h"
#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <gnuradio/blocks/copy.h>
#include <gnuradio/blocks/head.h>
#include <gnuradio/blocks/null_sink.h>
#include <gnuradio/blocks/vector_source.h>
#include <gnuradio/halfplane/aligner.h>
#include <gnuradio/halfplane/link_watch.h>
#include <gnuradio/top_block.h>

#include <nlohmann/json.hpp>

#include <chrono>
#include <complex>
#include <cstdio>
#include <string>
#include <vector>

namespace {

using halfplane::signal_set;
using clock_type = std::chrono::steady_clock;

constexpr const char* text = "draw:1"; // period 4096: the source may repeat 65,536 symbols for ever

std::vector<gr_complex> received(const signal_set& set)
{
    const halfplane::predictor rates(set);
    std::vector<gr_complex> out(1 << 16);
    halfplane::kernels::complex_noise(1).draw(
        0, out.size(), set.es() / *rates.es_n0_for_ser(1e-2), out.data());
    std::vector<std::uint16_t> sent(out.size());
    halfplane::pattern(text, set).indices(0, sent.size(), sent.data());
    for (std::size_t k = 0; k < out.size(); ++k)
        out[k] += gr_complex(set.points()[sent[k]]);
    return out;
}

double seconds_of(const gr::top_block_sptr& graph)
{
    const auto began = clock_type::now();
    graph->run();
    return std::chrono::duration<double>(clock_type::now() - began).count();
}

/// Msymbol/s of the host's copy block alone.
double host_copy(const std::vector<gr_complex>& in, std::uint64_t symbols)
{
    const auto graph = gr::make_top_block("copy");
    const auto source = gr::blocks::vector_source_c::make(in, true);
    const auto head = gr::blocks::head::make(sizeof(gr_complex), symbols);
    const auto copy = gr::blocks::copy::make(sizeof(gr_complex));
    graph->connect(source, 0, head, 0);
    graph->connect(head, 0, copy, 0);
    graph->connect(copy, 0, gr::blocks::null_sink::make(sizeof(gr_complex)), 0);
    return static_cast<double>(symbols) * 1e-6 / seconds_of(graph);
}

struct speed {
    double msymbols, reports_a_second;
};

speed link(const signal_set& set, std::uint64_t symbols)
{
    const auto graph = gr::make_top_block("link");
    const auto source = gr::blocks::vector_source_c::make(received(set), true);
    const auto head = gr::blocks::head::make(sizeof(gr_complex), symbols);
    const auto align = gr::halfplane::aligner::make(set, text);
    const auto watch = gr::halfplane::link_watch::make(set, text, 100000);
    graph->connect(source, 0, head, 0);
    graph->connect(head, 0, align, 0);
    graph->connect(align, 0, watch, 0);
    graph->connect(align, 1, watch, 1);
    const double seconds = seconds_of(graph);
    const auto report = nlohmann::json::parse(watch->report());
    if (report.at("total").at("in") != symbols)
        std::printf("symbols are missing: %s\n", report.at("total").dump().c_str());
    return {static_cast<double>(symbols) * 1e-6 / seconds,
            (report.at("sequence").get<double>() + 1) / seconds};
}

} // namespace

int main()
{
    std::printf("aligner and link_watch in a flowgraph, SER 1e-2, wall clock, both cores\n"
                "  M      Msymbol/s  / M = 16  / host's copy  reports/s\n");
    double at_16 = 0;
    for (const int points : {16, 256, 4096}) {
        const auto set = halfplane::named_set("qam:" + std::to_string(points));
        const double copy = host_copy(received(set), 100'000'000);
        const auto s = link(set, points > 1000 ? 40'000'000 : 100'000'000);
        if (points == 16)
            at_16 = s.msymbols;
        std::printf("%5d %12.1f %9.2f %14.2f %10.1f\n",
                    points,
                    s.msymbols,
                    s.msymbols / at_16,
                    s.msymbols / copy,
                    s.reports_a_second);
    }
    std::printf(
        "wanted: 25 Msymbol/s at 16 with 10 reports/s; 0.85 of that at 256; a report a second at 4096\n");
}
