// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans for Python.
#include "bind.h"

#include <gnuradio/halfplane/known_spans.h>

namespace py = pybind11;
using gr::halfplane::known_spans;

void bind_known_spans(py::module& m)
{
    py::class_<known_spans, gr::block, gr::basic_block, known_spans::sptr>(
        m,
        "known_spans",
        R"doc(Puts a reference beside those symbols of live traffic of which somebody knows what was sent.

In: one complex sample a symbol. Out 0: the same samples. Out 1 (short): the index that was sent where a span says
so, 4096 more where it is known only by decoding, -5 (live traffic) elsewhere. link_watch follows. Sample k comes
out as sample k once hold_back later ones are in: that is the time in which spans may be handed in.

Spans come as tags of the input with key tag_key, at the span's first symbol: a vector of integers (pmt u8, s16, u16,
s32 ...) or a dict {indices: vector, decoded: bool}; or as PDUs on message port 'known': ({first_symbol, decoded},
vector), first_symbol counted from 0 at the block's input. decoded: of a frame whose check held, encoded anew; frames that
failed are missing among these, so they flatter, and are counted apart.

set: the constellation. hold_back: symbols, 0 ... 2**24, more than a frame and all that the receiver buffers.

Tags out: 'pending' on both, those of the input on output 0. Message port 'spans' out: counts, once a second at most.
Raises ValueError naming parameter and value; a tag or message that is not understood is logged and counted.)doc")
        .def(py::init(&known_spans::make),
             py::arg("set"),
             py::arg("hold_back") = std::uint64_t{4096},
             py::arg("tag_key") = "known")
        .def("hold_back",
             &known_spans::hold_back,
             "Symbols held back: output = max(0, input - hold_back) until the input ends.")
        .def(
            "counts",
            [](const known_spans& block) {
                const auto c = block.counts();
                py::dict counts;
                counts["known"] = c.known;
                counts["decoded"] = c.decoded;
                counts["live"] = c.live;
                counts["spans"] = c.spans;
                counts["conflicts"] = c.conflicts;
                counts["late"] = c.late;
                counts["early"] = c.early;
                counts["refused"] = block.refused();
                return counts;
            },
            R"doc(Dict of counts. Of symbols that went out: known, decoded, live. Of spans: spans taken, conflicts (contradict an
earlier span, left out), refused (not understood). Symbols of spans that went out before: late; too far ahead: early.)doc");
}
