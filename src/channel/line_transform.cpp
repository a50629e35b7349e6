// SPDX-License-Identifier: GPL-3.0-or-later
#include "line_transform.hpp"

#include <algorithm>
#include <cassert>

#include "tonewalk/maths/window.hpp"

namespace tonewalk {

line_transform::line_transform(std::size_t size) : weights_(size), transform_{size} {
    const window shape = blackman_harris_window(size);
    noise_bins_ = shape.noise_bandwidth_bins();
    const double scale = 1.0 / (shape.coherent_gain() * static_cast<double>(size));
    std::transform(shape.values().begin(), shape.values().end(), weights_.begin(),
                   [scale](double w) { return static_cast<float>(w * scale); });
}

std::span<const cf32> line_transform::run(std::span<const cf32> segment) {
    assert(segment.size() == size());
    const std::span<cf32> in = transform_.input();
    for (std::size_t n = 0; n < size(); ++n) {
        in[n] = {segment[n].real() * weights_[n], segment[n].imag() * weights_[n]};
    }
    transform_.run();
    return transform_.output();
}

} // namespace tonewalk
