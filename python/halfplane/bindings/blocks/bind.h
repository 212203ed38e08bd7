// SPDX-License-Identifier: GPL-3.0-or-later
// bind: one function a block, each in a file of its own.
#pragma once

#include <pybind11/pybind11.h>

void bind_point_mapper(pybind11::module& m);
void bind_report_pmt(pybind11::module& m);
