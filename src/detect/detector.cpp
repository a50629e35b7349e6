// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/detector.hpp"

#include "tonewalk/detect/envelope_detector.hpp"
#include "tonewalk/detect/synchronous_detector.hpp"

namespace tonewalk {

std::unique_ptr<detector> make_detector(detector_kind kind, double rate_hz, double width_hz) {
    if (kind == detector_kind::synchronous) {
        return std::make_unique<synchronous_detector>(
            synchronous_detector::config{.rate_hz = rate_hz});
    }
    return std::make_unique<envelope_detector>(
        envelope_detector::config{.rate_hz = rate_hz, .width_hz = width_hz});
}

} // namespace tonewalk
