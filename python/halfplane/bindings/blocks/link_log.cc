// SPDX-License-Identifier: GPL-3.0-or-later
// link_log for Python.
#include "bind.h"

#include <gnuradio/halfplane/link_log.h>

namespace py = pybind11;
using gr::halfplane::link_log;

void bind_link_log(py::module& m)
{
    py::class_<link_log, gr::block, gr::basic_block, link_log::sptr>(m,
                                                                     "link_log",
                                                                     R"doc(Reports as JSON lines in a file.

path: file to append to. max_bytes: size beyond which it is put aside as path.1, path.2 ..., 0: never. Message port 'report' (in): each dict becomes one line, written before the publisher goes
on, so that what was reported was also written. Raises ValueError where the file cannot be opened.)doc")
        .def(py::init(&link_log::make), py::arg("path"), py::arg("max_bytes") = std::uint64_t{0})
        .def("written", &link_log::written, "Reports written so far.");
}
