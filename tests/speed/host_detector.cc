// SPDX-License-Identifier: GPL-3.0-or-later
#include "host_detector.h"

#include <gnuradio/digital/constellation.h>

struct host_detector::impl {
    gr::digital::constellation_calcdist::sptr constellation;
};

host_detector::host_detector(const std::vector<std::complex<double>>& points) : d(std::make_unique<impl>())
{
    std::vector<gr_complex> in_float;
    std::vector<int> labels;
    for (std::size_t i = 0; i < points.size(); ++i) {
        in_float.emplace_back(points[i]);
        labels.push_back(static_cast<int>(i));
    }
    d->constellation = gr::digital::constellation_calcdist::make(
        in_float, labels, 4, 1, gr::digital::constellation::NO_NORMALIZATION);
}

host_detector::~host_detector() = default;

unsigned long host_detector::hard(const std::complex<float>* in, std::size_t count) const
{
    unsigned long sum = 0;
    for (std::size_t k = 0; k < count; ++k)
        sum += d->constellation->decision_maker(in + k);
    return sum;
}

float host_detector::soft(const std::complex<float>* in, std::size_t count) const
{
    float sum = 0;
    for (std::size_t k = 0; k < count; ++k)
        sum += d->constellation->soft_decision_maker(in[k])[0];
    return sum;
}
