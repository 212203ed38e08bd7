// SPDX-License-Identifier: GPL-3.0-or-later
// energy: a program that uses the core alone.
#include <halfplane/signal_set.h>

#include <iostream>

int main()
{
    const auto set = halfplane::signal_set::with_natural_labels({{3, 0}, {0, 1}, {-3, 0}, {0, -1}});
    std::cout << "es " << set.es() << "\n"; // (9 + 1 + 9 + 1) / 4
    return set.es() == 5 ? 0 : 1;
}
