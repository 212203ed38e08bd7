// SPDX-License-Identifier: GPL-3.0-or-later
// blocks_python: the GNU Radio blocks for Python.
#include "blocks/bind.h"

namespace py = pybind11;

PYBIND11_MODULE(blocks_python, m)
{
    // PMT, the base classes of every block, and signal_set are registered by these.
    py::module::import("pmt");
    py::module::import("gnuradio.gr");
    py::module::import("gnuradio.halfplane.core_python");
    bind_aligner(m);
    bind_input_gauge(m);
    bind_known_spans(m);
    bind_link_log(m);
    bind_link_watch(m);
    bind_llr_detector(m);
    bind_error_tally(m);
    bind_noise_at(m);
    bind_point_detector(m);
    bind_point_mapper(m);
    bind_report_pmt(m);
    bind_test_pattern(m);
}
