// SPDX-License-Identifier: GPL-3.0-or-later
// core_python: the Python module of everything that needs no GNU Radio.
#include "topics.h"

PYBIND11_MODULE(core_python, m)
{
    m.doc() =
        "The core of halfplane on numpy arrays: sets, predicted rates, intervals, tallies, gauges, patterns.";
    m.attr("__version__") = HALFPLANE_VERSION;
    halfplane::python::bind_sets(m);
    halfplane::python::bind_set_files(m);
    halfplane::python::bind_laws(m);
    halfplane::python::bind_rates(m);
    halfplane::python::bind_geometry(m);
    halfplane::python::bind_measures(m);
    halfplane::python::bind_simulate(m);
    halfplane::python::bind_planning(m);
    halfplane::python::bind_recordings(m);
}
