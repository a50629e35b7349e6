// SPDX-License-Identifier: GPL-3.0-or-later
#include "strip_picture.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/base/decibel.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t columns = 128, most_rows = 240;
constexpr double hann_noise_bins = 1.5;

} // namespace

strip_picture::strip_picture(double width_hz, double carrier_offset_hz)
    : width_hz_{width_hz}, carrier_offset_hz_{carrier_offset_hz} {}

std::size_t strip_picture::column_of(double hz) const noexcept {
    const double place = (hz / width_hz_ + 0.5) * static_cast<double>(columns);
    return static_cast<std::size_t>(std::clamp(place, 0.0, static_cast<double>(columns - 1)));
}

void strip_picture::add(double time_s, std::span<const float> noise_powers, double bin_hz,
                        std::span<const fitted_line> lines) {
    if (rows_.empty() || rows_.back().records >= static_cast<double>(records_a_row_)) {
        if (rows_.size() == most_rows) {
            pool();
        }
        rows_.push_back({0.0, 0.0, std::vector<double>(columns, 0.0)});
    }
    row& now = rows_.back();
    now.time_sum += time_s;
    now.records += 1.0;
    const auto size = static_cast<int>(noise_powers.size());
    const auto reach = std::min(static_cast<int>(width_hz_ / 2.0 / bin_hz), (size - 1) / 2);
    for (int k = -reach; k <= reach; ++k) {
        const auto place = static_cast<std::size_t>(k < 0 ? k + size : k);
        now.power[column_of(k * bin_hz)] +=
            static_cast<double>(noise_powers[place]) / hann_noise_bins;
    }
    for (const fitted_line& line : lines) {
        if (std::abs(line.hz) <= width_hz_ / 2.0) {
            now.power[column_of(line.hz)] += std::norm(line.amplitude);
        }
    }
}

void strip_picture::pool() {
    for (std::size_t k = 0; 2 * k + 1 < rows_.size(); ++k) {
        row joined = rows_[2 * k];
        const row& other = rows_[2 * k + 1];
        joined.time_sum += other.time_sum;
        joined.records += other.records;
        for (std::size_t c = 0; c < columns; ++c) {
            joined.power[c] += other.power[c];
        }
        rows_[k] = std::move(joined);
    }
    rows_.resize(rows_.size() / 2);
    records_a_row_ *= 2;
}

curve strip_picture::result() const {
    curve c;
    c.name = c.kind = "strip";
    c.x_unit = "Hz";
    c.y_unit = "s";
    c.z_unit = "dBFS";
    for (std::size_t k = 0; k < columns; ++k) {
        const double middle = (static_cast<double>(k) + 0.5) / static_cast<double>(columns) - 0.5;
        c.x.push_back(carrier_offset_hz_ + middle * width_hz_);
    }
    for (const row& each : rows_) {
        c.y.push_back(each.time_sum / each.records);
        for (const double power : each.power) {
            c.z.push_back(decibel::from_power_ratio(power / each.records).db());
        }
    }
    return c;
}

} // namespace tonewalk
