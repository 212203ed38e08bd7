// SPDX-License-Identifier: GPL-3.0-or-later
// label_search: prints the labels that search_labels() finds, as a row of a table of label_tables.cc.
#include "halfplane/labelling.h"
#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <cstdio>
#include <cstdlib>
#include <exception>

int main(int argc, char** argv)
{
    using namespace halfplane;
    if (argc != 6) {
        std::fprintf(stderr, "label_search SET ES_N0_DB SEED RESTARTS STEPS_A_POINT\n");
        return 2;
    }
    try {
        const auto set = load_set(argv[1]);
        const auto natural = signal_set::with_natural_labels(set.points()); // a start that no table changes
        labelling_search how{from_db(std::atof(argv[2]))};
        how.seed = std::strtoull(argv[3], nullptr, 10);
        how.restarts = static_cast<unsigned>(std::atoi(argv[4]));
        how.steps_a_point = static_cast<unsigned>(std::atoi(argv[5]));
        const auto found = set.relabelled(search_labels(natural, how));
        std::fprintf(stderr,
                     "%s at %s dB: BER %.8g, the named set's own %.8g; SER/b %.6g\n",
                     argv[1],
                     argv[2],
                     predictor(found).ber(how.es_n0),
                     predictor(set).ber(how.es_n0),
                     predictor(set).ser(how.es_n0) / set.label_bits());
        for (std::size_t k = 0; k < found.size(); ++k)
            std::printf("%u%s",
                        found.labels()[k],
                        k + 1 == found.size() ? "\n"
                        : k % 16 == 15        ? ",\n"
                                              : ", ");
    } catch (const std::exception& e) {
        std::fprintf(stderr, "%s\n", e.what());
        return 2;
    }
}
