// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/sample_gaps.hpp"

#include <algorithm>

namespace tonewalk {
namespace {

sample_index end(const sample_range& range) noexcept {
    return range.first + range.count;
}

/// The first range that ends after sample `n`.
auto first_ending_after(std::vector<sample_range>& ranges, sample_index n) noexcept {
    return std::partition_point(ranges.begin(), ranges.end(),
                                [n](const sample_range& range) { return end(range) <= n; });
}

} // namespace

void sample_gaps::add(std::span<const sample_range> ranges, sample_index spread) {
    for (const sample_range& range : ranges) {
        if (range.count > 0) {
            add({range.first - spread, range.count + 2 * spread});
        }
    }
}

/// Joins the new range with all that it touches.
void sample_gaps::add(sample_range range) {
    const auto from = first_ending_after(ranges_, range.first - 1);
    auto until = from;
    while (until != ranges_.end() && until->first <= end(range)) {
        const sample_index last = std::max(end(range), end(*until));
        range.first = std::min(range.first, until->first);
        range.count = last - range.first;
        ++until;
    }
    ranges_.insert(ranges_.erase(from, until), range);
}

bool sample_gaps::touches(sample_index first, sample_index count) const noexcept {
    const auto hit =
        std::partition_point(ranges_.begin(), ranges_.end(),
                             [first](const sample_range& range) { return end(range) <= first; });
    return hit != ranges_.end() && hit->first < first + count;
}

void sample_gaps::forget_before(sample_index n) noexcept {
    ranges_.erase(ranges_.begin(), first_ending_after(ranges_, n));
}

} // namespace tonewalk
