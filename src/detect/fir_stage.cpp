// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/fir_stage.hpp"

#include <algorithm>
#include <cassert>

#include "dot.hpp"

namespace tonewalk {
namespace {

/// Index inside [0, size) that mirroring about both ends makes of any index.
sample_index mirrored(sample_index index, sample_index size) noexcept {
    if (size == 1) {
        return 0;
    }
    const sample_index period = 2 * (size - 1);
    const sample_index within = ((index % period) + period) % period;
    return std::min(within, period - within);
}

} // namespace

template <class Sample>
fir_stage<Sample>::fir_stage(const config& c) : up_{c.up}, down_{c.down} {
    assert(up_ > 0 && down_ > 0 && c.taps.size() % 2 == 1);
    const auto taps = static_cast<sample_index>(c.taps.size());
    const auto up = static_cast<sample_index>(up_);
    const sample_index reach = (taps / 2 + up - 1) / up;
    reach_ = static_cast<std::size_t>(reach);
    for (sample_index phase = 0; phase < up; ++phase) {
        for (sample_index i = -reach; i <= reach; ++i) { // input i from the output's own
            const sample_index tap = taps / 2 + phase - i * up;
            const bool inside = tap >= 0 && tap < taps;
            rows_.push_back(inside ? static_cast<double>(up) * c.taps[static_cast<std::size_t>(tap)]
                                   : 0.0);
        }
    }
}

template <class Sample>
void fir_stage<Sample>::begin() noexcept {
    history_.clear();
    first_ = inputs_ = outputs_ = 0;
    mirrored_ = false;
}

template <class Sample>
void fir_stage<Sample>::add(std::span<const Sample> in, std::vector<Sample>& out) {
    history_.insert(history_.end(), in.begin(), in.end());
    inputs_ += static_cast<sample_index>(in.size());
    if (!mirrored_ && inputs_ > static_cast<sample_index>(reach_)) {
        mirror_start();
    }
    if (mirrored_) {
        produce(out);
    }
}

template <class Sample>
void fir_stage<Sample>::end(std::vector<Sample>& out) {
    if (inputs_ == 0) {
        return;
    }
    if (!mirrored_) {
        mirror_start();
    }
    mirror_end();
    produce(out);
}

template <class Sample>
void fir_stage<Sample>::mirror_start() {
    const auto reach = static_cast<sample_index>(reach_);
    std::vector<Sample> before;
    for (sample_index i = -reach; i < 0; ++i) {
        before.push_back(history_[static_cast<std::size_t>(mirrored(i, inputs_))]);
    }
    history_.insert(history_.begin(), before.begin(), before.end());
    first_ = -reach;
    mirrored_ = true;
}

template <class Sample>
void fir_stage<Sample>::mirror_end() {
    const auto reach = static_cast<sample_index>(reach_);
    for (sample_index i = inputs_; i < inputs_ + reach; ++i) {
        const sample_index source = mirrored(i, inputs_);
        history_.push_back(history_[static_cast<std::size_t>(source - first_)]);
    }
}

template <class Sample>
void fir_stage<Sample>::produce(std::vector<Sample>& out) {
    const auto up = static_cast<sample_index>(up_), down = static_cast<sample_index>(down_);
    const auto reach = static_cast<sample_index>(reach_);
    const sample_index known = first_ + static_cast<sample_index>(history_.size());
    const sample_index total = (inputs_ * up + down - 1) / down;
    const std::size_t row_taps = 2 * reach_ + 1;
    while (outputs_ < total && outputs_ * down / up + reach < known) {
        const sample_index centre = outputs_ * down / up;
        const auto phase = static_cast<std::size_t>(outputs_ * down - centre * up);
        const std::span row{rows_.data() + phase * row_taps, row_taps};
        out.push_back(static_cast<Sample>(dot(row, history_.data() + (centre - reach - first_))));
        ++outputs_;
    }
    forget();
}

/// Drops inputs that neither the next output nor the mirror at the end will want.
template <class Sample>
void fir_stage<Sample>::forget() {
    const auto reach = static_cast<sample_index>(reach_);
    const sample_index next =
        outputs_ * static_cast<sample_index>(down_) / static_cast<sample_index>(up_) - reach;
    const sample_index surplus = std::min(next, inputs_ - reach - 1) - first_;
    if (surplus > static_cast<sample_index>(history_.size() / 2)) {
        history_.erase(history_.begin(), history_.begin() + surplus);
        first_ += surplus;
    }
}

template class fir_stage<float>;
template class fir_stage<cf32>;

} // namespace tonewalk
