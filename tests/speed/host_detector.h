// SPDX-License-Identifier: GPL-3.0-or-later
// host_detector: the host's own nearest-point and soft decoders, called in a plain loop.
#pragma once

#include <complex>
#include <cstddef>
#include <memory>
#include <vector>

class host_detector
{
public:
    explicit host_detector(const std::vector<std::complex<double>>& points);
    ~host_detector();
    /// Sum of the decisions, so that nothing is optimised away.
    unsigned long hard(const std::complex<float>* in, std::size_t count) const;
    float soft(const std::complex<float>* in, std::size_t count) const;

private:
    struct impl;
    std::unique_ptr<impl> d;
};
