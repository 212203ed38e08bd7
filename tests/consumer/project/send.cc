// SPDX-License-Identifier: GPL-3.0-or-later
// send: a flowgraph in C++ with a block of the installed module.
#include <gnuradio/blocks/vector_sink.h>
#include <gnuradio/blocks/vector_source.h>
#include <gnuradio/halfplane/point_mapper.h>
#include <gnuradio/top_block.h>

#include <iostream>

int main()
{
    const auto set = ::halfplane::signal_set::with_natural_labels({{3, 0}, {0, 1}, {-3, 0}, {0, -1}});
    auto graph = gr::make_top_block("send");
    auto source = gr::blocks::vector_source_s::make({3, 0, 1, 2});
    auto mapper = gr::halfplane::point_mapper::make(set);
    auto sink = gr::blocks::vector_sink_c::make();
    graph->connect(source, 0, mapper, 0);
    graph->connect(mapper, 0, sink, 0);
    graph->run();
    const std::vector<gr_complex> expected{{0, -1}, {3, 0}, {0, 1}, {-3, 0}};
    std::cout << sink->data().size() << " samples\n";
    return sink->data() == expected ? 0 : 1;
}
