// SPDX-License-Identifier: GPL-3.0-or-later
#include "carrier_signal.hpp"

#include <algorithm>
#include <limits>

#include "exact.hpp"

namespace tonewalk {

namespace {
constexpr double light_m_s = 299792458.0;
}

std::vector<wave_group> wave_groups(const scene_carrier& carrier) {
    std::vector<wave_group> groups;
    for (const scene_wave& wave : carrier.waves) {
        const auto same = std::find_if(groups.begin(), groups.end(), [&](const wave_group& group) {
            return group.delay_s == wave.delay_s;
        });
        if (same == groups.end())
            groups.push_back({wave.delay_s, {wave}});
        else
            same->waves.push_back(wave);
    }
    if (groups.empty())
        groups.push_back({0.0, {scene_wave{.direction_deg = 90.0}}});
    return groups;
}

double longest_delay_s(const scene_carrier& carrier) {
    double longest = 0.0;
    for (const scene_wave& wave : carrier.waves)
        longest = std::max(longest, wave.delay_s);
    return longest;
}

double wavelength_m(double frequency_hz) noexcept {
    return frequency_hz > 0.0 ? light_m_s / frequency_hz : std::numeric_limits<double>::infinity();
}

carrier_signal::carrier_signal(const scene& whole, std::size_t carrier)
    : path_{whole.path}, rate_hz_{whole.rate_hz}, amplitude_{amplitude_from_db(
                                                      whole.carriers[carrier].level_dbfs)},
      common_{whole.carriers[carrier], whole.path} {
    const scene_carrier& described = whole.carriers[carrier];
    const double history_s = longest_delay_s(described);
    for (wave_group& group : wave_groups(described))
        arrivals_.push_back({transmission{whole, carrier, group.delay_s, history_s}, group.waves,
                             wave_sum{group.waves, path_, wavelength_m(0.0)}});
}

void carrier_signal::tune(const carrier_tuning& tuning) {
    for (arrival& each : arrivals_) {
        each.sent.tune(tuning.offset_hz, tuning.frequency_hz);
        each.sum = wave_sum{each.waves, path_, wavelength_m(tuning.frequency_hz)};
    }
}

void carrier_signal::add(sample_index first, std::span<cf64> out) {
    const auto time_s = [&](std::size_t k) {
        return static_cast<double>(first + static_cast<sample_index>(k)) / rate_hz_;
    };
    factor_.resize(out.size());
    if (common_.constant())
        std::fill(factor_.begin(), factor_.end(), amplitude_ * common_.at(0.0));
    else
        for (std::size_t k = 0; k < out.size(); ++k)
            factor_[k] = amplitude_ * common_.at(time_s(k));
    for (arrival& each : arrivals_)
        add_arrival(each, first, out);
}

void carrier_signal::add_arrival(arrival& from, sample_index first, std::span<cf64> out) {
    received_.resize(out.size());
    from.sent.render(first, received_);
    const cf64 still = from.sum.at(0.0);
    for (std::size_t k = 0; k < out.size(); ++k) {
        const cf64 field =
            from.sum.constant()
                ? still
                : from.sum.at(static_cast<double>(first + static_cast<sample_index>(k)) / rate_hz_);
        out[k] += product(received_[k], product(factor_[k], field));
    }
}

} // namespace tonewalk
