// SPDX-License-Identifier: GPL-3.0-or-later
#include "halfplane/kernels/random_words.h"

#include "loops.h"

namespace halfplane::kernels {

void random_words::draw(std::uint64_t first, std::size_t count, std::uint32_t* out) const
{
    loops().words(d_seed, d_stream, first, count, out);
}

} // namespace halfplane::kernels
