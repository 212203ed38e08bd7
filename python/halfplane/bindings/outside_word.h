// SPDX-License-Identifier: GPL-3.0-or-later
// outside_word: what ends a long computation from outside: Ctrl-C, or a callback that says so.
#pragma once

#include "topics.h"

namespace halfplane::python {

/// Asked now and then by a computation that runs without the interpreter.
class outside_word
{
public:
    /// False where Ctrl-C was pressed, or where `progress` (may be None) returns False. What it raises is
    /// thrown.
    template <typename... Values>
    bool goes_on(const py::object& progress, const Values&... values)
    {
        py::gil_scoped_acquire python;
        // Signals reach Python code only between its own instructions, of which there are none meanwhile.
        if (PyErr_CheckSignals() != 0) {
            interrupted = PyErr_ExceptionMatches(PyExc_KeyboardInterrupt) != 0;
            if (!interrupted)
                throw py::error_already_set();
            PyErr_Clear();
            return false;
        }
        if (progress.is_none())
            return true;
        const py::object answer = progress(values...);
        return answer.is_none() || answer.cast<bool>();
    }

    bool interrupted = false;
};

} // namespace halfplane::python
