// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

std::optional<sample_index> stream_facts::samples() const noexcept {
    sample_index sum = 0;
    for (const auto& stretch : stretches) {
        if (!stretch.count)
            return std::nullopt;
        sum += *stretch.count;
    }
    return sum;
}

double stream_facts::duration_s() const noexcept {
    return static_cast<double>(samples().value_or(0)) / sample_rate_hz;
}

double stream_facts::span_s() const noexcept {
    if (stretches.empty() || !samples())
        return 0.0;
    const auto& last = stretches.back();
    const sample_index end = last.position + *last.count;
    return static_cast<double>(end - stretches.front().position) / sample_rate_hz;
}

std::string stream_facts::where() const {
    return name == "-" ? "standard input" : name;
}

} // namespace tonewalk
