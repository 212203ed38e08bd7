// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of set files and of named constellations.
#include "topics.h"

#include "halfplane/set_file.h"

#include <pybind11/stl.h>

#include <fstream>
#include <sstream>

namespace halfplane::python {
namespace {

bool is_csv(const std::string& path)
{
    return path.size() > 4 && path.compare(path.size() - 4, 4, ".csv") == 0;
}

void write_set(const signal_set& set, const std::string& path)
{
    std::ofstream out(path);
    if (is_csv(path))
        write_set_csv(out, set);
    else
        write_set_json(out, set);
    out.flush();
    if (!out)
        throw std::invalid_argument(path + ": cannot be written");
}

std::string set_json(const signal_set& set)
{
    std::ostringstream out;
    write_set_json(out, set);
    return out.str();
}

} // namespace

void bind_set_files(py::module_& m)
{
    m.def("write_set",
          &write_set,
          py::arg("set"),
          py::arg("path"),
          "Writes a set file: CSV where the path ends in .csv, else JSON. Reads back to the very same "
          "doubles.");
    m.def("set_json", &set_json, py::arg("set"), "The text of a JSON set file.");
    m.def(
        "parse_set_json",
        [](const std::string& text, const std::string& source) {
            std::istringstream in(text);
            return read_set_json(in, source);
        },
        py::arg("text"),
        py::arg("source"),
        "A constellation from the text of a JSON set file; source is what refusals call it.");
    m.def("load_set",
          &load_set,
          py::arg("what"),
          "A constellation by name (psk:8, apsk:4+12:2.85, std:38.211/16qam) or from a set file (JSON or "
          "CSV).\n\n"
          "Raises invalid_set with file, line or index, field and value of what is refused.");
    m.def("named_set", &named_set, py::arg("name"), "A named family or std: constellation only.");
    py::class_<named_set_entry>(m, "named_set_entry", "One line of the listing of named constellations.")
        .def_readonly("name", &named_set_entry::name, "What to write as SET.")
        .def_readonly("about", &named_set_entry::about, "One line about it.")
        .def_readonly(
            "source", &named_set_entry::source, "Document and clause; says so where it stands from memory.");
    m.def("named_sets", &named_sets, "Everything named_set() knows, in listing order.");
}

} // namespace halfplane::python
