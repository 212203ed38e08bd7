// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of signal_set.
#include "topics.h"

#include "halfplane/signal_set.h"

#include <pybind11/complex.h>
#include <pybind11/stl.h>

#include <sstream>

namespace halfplane::python {
namespace {

std::vector<complex> points_from(const complexes& points)
{
    if (points.ndim() != 1)
        throw invalid_set("points: expected one dimension, got " + std::to_string(points.ndim()));
    return {points.data(), points.data() + points.size()};
}

unsigned bits_for(std::size_t size)
{
    unsigned bits = 1;
    while ((std::size_t(1) << bits) < size)
        ++bits;
    return bits;
}

struct labelling {
    std::vector<label_t> labels;
    unsigned bits;
};

labelling labels_from_strings(const std::vector<std::string>& texts)
{
    labelling result{{}, texts.empty() ? 1u : static_cast<unsigned>(texts.front().size())};
    for (std::size_t k = 0; k < texts.size(); ++k) {
        const std::string& text = texts[k];
        const auto where = "label of index " + std::to_string(k) + ": \"" + text + "\"";
        if (text.empty() || text.size() > signal_set::max_label_bits ||
            text.find_first_not_of("01") != std::string::npos)
            throw invalid_set(where + " is not 1 to 12 binary digits");
        if (text.size() != result.bits)
            throw invalid_set(where + " has " + std::to_string(text.size()) + " bits, the first one has " +
                              std::to_string(result.bits));
        result.labels.push_back(static_cast<label_t>(std::stoul(text, nullptr, 2)));
    }
    return result;
}

labelling labels_from(const py::object& labels, std::size_t size, unsigned label_bits)
{
    if (labels.is_none()) {
        labelling natural{{}, label_bits ? label_bits : bits_for(size)};
        for (std::size_t k = 0; k < size; ++k)
            natural.labels.push_back(static_cast<label_t>(k));
        return natural;
    }
    const auto items = py::list(labels);
    if (py::len(items) > 0 && py::isinstance<py::str>(items[0]))
        return labels_from_strings(items.cast<std::vector<std::string>>());
    labelling given{{}, label_bits ? label_bits : bits_for(size)};
    for (std::size_t k = 0; k < py::len(items); ++k) {
        const long value = py::int_(items[k]).cast<long>();
        if (value < 0 || value >= (1L << given.bits))
            throw invalid_set("label of index " + std::to_string(k) + ": " + std::to_string(value) +
                              " does not fit into " + std::to_string(given.bits) + " bits");
        given.labels.push_back(static_cast<label_t>(value));
    }
    return given;
}

std::vector<double> priors_from(const py::object& priors)
{
    if (priors.is_none())
        return {};
    const auto values = priors.cast<doubles>();
    return {values.data(), values.data() + values.size()};
}

signal_set make_set(const complexes& points,
                    const py::object& labels,
                    unsigned label_bits,
                    const py::object& priors,
                    const std::string& name,
                    const std::string& note)
{
    auto list = points_from(points);
    auto labelled = labels_from(labels, list.size(), label_bits);
    return signal_set(
        std::move(list), std::move(labelled.labels), labelled.bits, priors_from(priors), name, note);
}

std::string shown(const signal_set& set)
{
    std::ostringstream out;
    out << "<signal_set " << (set.name().empty() ? "without a name" : set.name()) << ", " << set.size()
        << " points, " << set.label_bits() << "-bit labels" << (set.uniform() ? "" : ", unequal priors")
        << ">";
    return out.str();
}

void bind_signal_set(py::module_& m)
{
    py::class_<signal_set, std::shared_ptr<signal_set>>(
        m, "signal_set", R"(A constellation: M points with distinct labels and priors. Immutable.

points: M complex numbers, 2 to 4096, finite, distinct, any units; kept as given.
labels: M distinct binary strings of one length, or integers; natural ones (label = index) where left out.
priors: M positive probabilities that sum to 1; equal where left out.
label_bits: length of integer labels, 1 to 12; the shortest that holds M labels where left out.
Raises invalid_set (a ValueError) naming the index and the value that is refused.)")
        .def(py::init(&make_set),
             py::arg("points"),
             py::arg("labels") = py::none(),
             py::arg("label_bits") = 0,
             py::arg("priors") = py::none(),
             py::arg("name") = "",
             py::arg("note") = "")
        .def_static(
            "with_natural_labels",
            [](const complexes& points, const std::string& name) {
                return signal_set::with_natural_labels(points_from(points), name);
            },
            py::arg("points"),
            py::arg("name") = "",
            "Labels that count up with the index, equal priors.")
        .def_property_readonly(
            "points",
            [](const signal_set& s) { return array_of(s.points()); },
            "M complex numbers, by index.")
        .def_property_readonly(
            "labels",
            [](const signal_set& s) { return array_of(s.labels()); },
            "M labels as integers, by index.")
        .def_property_readonly(
            "label_strings",
            [](const signal_set& s) {
                std::vector<std::string> all;
                for (std::size_t k = 0; k < s.size(); ++k)
                    all.push_back(s.label_string(k));
                return all;
            },
            "M labels as binary strings, leftmost bit first.")
        .def_property_readonly(
            "priors", [](const signal_set& s) { return array_of(s.priors()); }, "M probabilities, by index.")
        .def_property_readonly("size", &signal_set::size, "M.")
        .def_property_readonly("label_bits", &signal_set::label_bits, "Bits of a label.")
        .def_property_readonly("name", &signal_set::name)
        .def_property_readonly("note", &signal_set::note)
        .def_property_readonly("uniform", &signal_set::uniform, "Whether all priors are equal.")
        .def_property_readonly("es", &signal_set::es, "Prior-weighted mean of |s|², linear.")
        .def_property_readonly("eb", &signal_set::eb, "Es over the entropy of the priors in bits, linear.")
        .def_property_readonly(
            "entropy_bits", &signal_set::entropy_bits, "Entropy of the priors in bits a symbol.")
        .def_property_readonly("mean", &signal_set::mean, "Prior-weighted mean of the points.")
        .def_property_readonly("papr_db", &signal_set::papr_db, "Peak over mean power in dB.")
        .def_property_readonly("d_min", &signal_set::d_min, "Smallest distance between two points.")
        .def(
            "label_string",
            [](const signal_set& s, std::size_t index) {
                if (index >= s.size())
                    throw py::index_error("index " + std::to_string(index) + " of a set of " +
                                          std::to_string(s.size()));
                return s.label_string(index);
            },
            py::arg("index"),
            "Label of a point as a binary string.")
        .def(
            "index_of_label",
            [](const signal_set& s, const std::string& label) -> std::optional<int> {
                const auto parsed = labels_from_strings({label});
                const int index = parsed.bits == s.label_bits() ? s.index_of_label(parsed.labels[0]) : -1;
                return index < 0 ? std::nullopt : std::optional<int>(index);
            },
            py::arg("label"),
            "Index of the point that carries a label (binary string), None where no point does.")
        .def("scaled", &signal_set::scaled, py::arg("factor"), "Every point multiplied by a complex factor.")
        .def("translated",
             &signal_set::translated,
             py::arg("offset"),
             "Every point moved by a complex offset.")
        .def(
            "relabelled",
            [](const signal_set& s, const py::object& labels) {
                return s.relabelled(labels_from(labels, s.size(), s.label_bits()).labels);
            },
            py::arg("labels"),
            "The same points and priors under other labels.")
        .def(
            "with_priors",
            [](const signal_set& s, const py::object& priors) { return s.with_priors(priors_from(priors)); },
            py::arg("priors"),
            "The same points and labels under other priors (None: equal).")
        .def("renamed", &signal_set::renamed, py::arg("name"), py::arg("note") = "")
        .def("__len__", &signal_set::size)
        .def("__repr__", &shown);
}

} // namespace

void bind_sets(py::module_& m)
{
    py::register_exception<invalid_set>(m, "invalid_set", PyExc_ValueError);
    bind_signal_set(m);
}

} // namespace halfplane::python
