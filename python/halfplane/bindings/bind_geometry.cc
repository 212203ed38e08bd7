// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of the facts about a set: distances, facing points, symmetries.
#include "topics.h"

#include "halfplane/geometry.h"
#include "halfplane/outlines.h"

#include <pybind11/complex.h>
#include <pybind11/stl.h>

namespace halfplane::python {
namespace {

py::dict dict_of(const geometry_facts& f)
{
    py::list distances;
    for (const distance_count& each : f.distances) {
        py::dict one;
        one["d"] = each.d;
        one["pairs"] = each.pairs;
        distances.append(one);
    }
    py::dict out;
    if (!f.name.empty())
        out["name"] = f.name;
    out["size"] = f.size;
    out["label_bits"] = f.label_bits;
    out["entropy_bits"] = f.entropy_bits;
    out["es"] = f.es;
    out["eb"] = f.eb;
    out["mean_i"] = f.mean_i;
    out["mean_q"] = f.mean_q;
    out["papr_db"] = f.papr_db;
    out["d_min"] = f.d_min;
    out["closest_pairs"] = f.closest_pairs;
    out["mean_closest"] = f.mean_closest;
    out["facing"] = f.facing;
    out["mean_facing"] = f.mean_facing;
    out["facing_bit_distance"] = f.facing_bit_distance;
    out["gray"] = f.gray;
    out["gray_among_closest"] = f.gray_among_closest;
    out["distances"] = distances;
    out["rotations"] = f.rotations;
    out["mirrors"] = f.mirrors;
    return out;
}

} // namespace

void bind_geometry(py::module_& m)
{
    m.attr("default_tolerance") = default_tolerance;
    m.def(
        "inspect",
        [](const signal_set& set, double tolerance) {
            geometry_facts facts;
            {
                py::gil_scoped_release free;
                facts = inspect(set, tolerance);
            }
            return dict_of(facts);
        },
        py::arg("set"),
        py::arg("tolerance") = default_tolerance,
        "The facts of a set, as the document that `halfplane inspect --json` prints.\n\n"
        "tolerance: distances, edges and symmetries are taken equal within tolerance · d_min, 0 <= tolerance "
        "< "
        "0.25.");
    py::class_<symmetry>(m,
                         "symmetry",
                         "A map z → c + exp(i·angle)·(z − c), conjugating z − c first where mirrored, that "
                         "carries the set onto "
                         "itself.")
        .def_readonly("angle_rad", &symmetry::angle_rad, "In [0, 2π).")
        .def_readonly("mirrored", &symmetry::mirrored)
        .def_readonly("centre", &symmetry::centre)
        .def_property_readonly(
            "permutation",
            [](const symmetry& s) { return array_of(s.permutation); },
            "Point i goes to point permutation[i].");
    m.def(
        "symmetries",
        &symmetries,
        py::arg("set"),
        py::arg("tolerance") = default_tolerance,
        py::arg("centre") = complex(),
        "The symmetry group about a centre: the identity, rotations, then mirrors, each by ascending angle.");
    m.def(
        "facing_points",
        &facing_points,
        py::arg("set"),
        py::arg("tolerance") = default_tolerance,
        "By point, the indices that it faces under equal priors; tolerance 0 asks for every edge of positive "
        "length.");
    m.def(
        "distance_profile",
        [](const signal_set& set, double tolerance, std::size_t most) {
            std::vector<std::pair<double, std::uint64_t>> out;
            for (const distance_count& each : distance_profile(set, tolerance, most))
                out.emplace_back(each.d, each.pairs);
            return out;
        },
        py::arg("set"),
        py::arg("tolerance") = default_tolerance,
        py::arg("most") = 1000,
        "[(distance, ordered pairs)], ascending, at most `most` of them.");
    m.def(
        "outlines",
        [](const signal_set& set, double left, double right, double bottom, double top, double n0) {
            std::vector<std::vector<complex>> all;
            {
                py::gil_scoped_release free;
                all = outlines(set, n0, {left, right, bottom, top});
            }
            py::list out;
            for (const auto& each : all)
                out.append(array_of(each));
            return out;
        },
        py::arg("set"),
        py::arg("left"),
        py::arg("right"),
        py::arg("bottom"),
        py::arg("top"),
        py::arg("n0") = 0.0,
        "Decision cells as closed polygons within a frame: by index an array of vertices, counter-clockwise, "
        "empty where\nthe cell has no part there. n0: of MAP decisions under the set's priors, in the square "
        "of "
        "the points' unit; 0: the\nnearest point decides.");
}

} // namespace halfplane::python
