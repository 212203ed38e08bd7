// SPDX-License-Identifier: GPL-3.0-or-later
// explanation: when losses and premises are due.
#include "explanation.h"

namespace halfplane::link {

void explanation::refresh(const predictor& p, const ser_curve& curve, const loss_question& asked, bool last)
{
    const auto now = d_sums.symbols();
    if (now == 0 || (!last && now < d_symbols + d_symbols / 10 + 1))
        return;
    d_losses = find_losses(p, curve, d_sums, asked);
    d_premises = find_premises(d_sums);
    d_symbols = now;
}

} // namespace halfplane::link
