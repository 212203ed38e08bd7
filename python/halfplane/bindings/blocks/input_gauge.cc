// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge for Python.
#include "bind.h"

#include <gnuradio/halfplane/input_gauge.h>

#include <pybind11/stl.h>

namespace py = pybind11;
using gr::halfplane::input_gauge;

void bind_input_gauge(py::module& m)
{
    const auto free = py::call_guard<py::gil_scoped_release>();
    py::class_<input_gauge, gr::sync_block, gr::block, gr::basic_block, input_gauge::sptr>(
        m,
        "input_gauge",
        R"doc(Measures Es/N0 ahead of the receiver, from raw samples: by averaged periodograms.

sample_rate, symbol_rate: Hz. band: (low, high) in Hz relative to the centre, where all of the signal is; at least
symbol_rate wide. noise_band: (low, high) with nothing but noise, clear of the transmitter's sidelobes and of filters'
slopes; empty: the noise is learned while the transmitter is off. interval: seconds of samples a message.
segments: periodograms averaged for each, at least 64; fewer cost less time and widen the error.

Within 0.1 dB from 0 to 30 dB. A constant offset within the band counts as signal.

Message port 'input': {es_n0_db, es_n0_db_se, source: 'measured', segments, nonfinite} after each interval; connect it
to 'input' of link_watch. Message port 'transmitter' takes 'on' and 'off', as do tags of that key on the stream.
Raises ValueError naming parameter and value.)doc")
        .def(py::init(&input_gauge::make),
             py::arg("sample_rate"),
             py::arg("symbol_rate"),
             py::arg("band"),
             py::arg("noise_band") = std::vector<double>(),
             py::arg("interval") = 1.0,
             py::arg("segments") = std::size_t{4000})
        .def("set_transmitter",
             &input_gauge::set_transmitter,
             py::arg("on"),
             free,
             "Says whether the transmitter is on, from here on.")
        .def("reading",
             &input_gauge::reading,
             free,
             "What the latest message said, as JSON text; empty before the first.")
        .def("nonfinite", &input_gauge::nonfinite, free, "Samples that were NaN or infinite so far.");
}
