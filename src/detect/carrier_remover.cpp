// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/carrier_remover.hpp"

namespace tonewalk {

carrier_remover::carrier_remover(const config& c)
    : narrow_{{.rate_hz = c.rate_hz,
               .pass_edge_hz = 0.5 * c.low_edge_hz,
               .stop_edge_hz = c.low_edge_hz}} {}

void carrier_remover::begin() noexcept {
    narrow_.begin();
    pending_.clear();
}

void carrier_remover::add(std::span<const float> in, std::vector<float>& out) {
    pending_.insert(pending_.end(), in.begin(), in.end());
    narrow_.add(in, slow_);
    subtract(out);
}

void carrier_remover::end(std::vector<float>& out) {
    narrow_.end(slow_);
    subtract(out);
}

void carrier_remover::subtract(std::vector<float>& out) {
    for (std::size_t i = 0; i < slow_.size(); ++i) {
        out.push_back(pending_[i] - slow_[i]);
    }
    pending_.erase(pending_.begin(), pending_.begin() + static_cast<std::ptrdiff_t>(slow_.size()));
    slow_.clear();
}

} // namespace tonewalk
