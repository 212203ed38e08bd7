// SPDX-License-Identifier: GPL-3.0-or-later
// bind: one function a block, each in a file of its own.
#pragma once

#include <pybind11/pybind11.h>

void bind_aligner(pybind11::module& m);
void bind_error_tally(pybind11::module& m);
void bind_input_gauge(pybind11::module& m);
void bind_known_spans(pybind11::module& m);
void bind_link_log(pybind11::module& m);
void bind_link_watch(pybind11::module& m);
void bind_llr_detector(pybind11::module& m);
void bind_noise_at(pybind11::module& m);
void bind_point_detector(pybind11::module& m);
void bind_point_mapper(pybind11::module& m);
void bind_report_pmt(pybind11::module& m);
void bind_test_pattern(pybind11::module& m);
