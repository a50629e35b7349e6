// SPDX-License-Identifier: GPL-3.0-or-later
#include "level_interval.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/maths/distribution.hpp"

namespace tonewalk {
namespace {

constexpr double step = 0.25;               // of the root of the ratio
constexpr double most_root = 18.0;          // 25 dB
constexpr double most_independent = 4000.0; // beyond, the noise counts as known
constexpr double false_detection = 1e-3;
constexpr double below_low = 0.975, below_high = 0.025;

double root_of_noncentrality(double ratio, double p, int degrees, double independent) {
    return std::sqrt(noncentral_f_noncentrality(ratio, p, degrees, 2.0 * independent));
}

} // namespace

const amplitude_limits::table& amplitude_limits::table_for(int degrees, double independent) {
    const double k = std::clamp(independent, 2.0, most_independent);
    constexpr double buckets_per_e = 30.0; // about 3 % each
    const int bucket = static_cast<int>(std::lround(std::log(k) * buckets_per_e));
    const auto found = tables_.find({degrees, bucket});
    if (found != tables_.end()) {
        return found->second;
    }
    table made;
    const double nominal = std::exp(bucket / buckets_per_e);
    for (double root = 0.0; root <= most_root + step; root += step) {
        made.low.push_back(root_of_noncentrality(root * root, below_low, degrees, nominal));
        made.high.push_back(
            root_of_noncentrality(std::max(1e-9, root * root), below_high, degrees, nominal));
    }
    return tables_.emplace(std::pair{degrees, bucket}, std::move(made)).first->second;
}

amplitude_limits::pair amplitude_limits::operator()(double ratio, int degrees, double independent) {
    const double root = std::sqrt(std::max(0.0, ratio));
    if (root < most_root) {
        const table& t = table_for(degrees, independent);
        const double place = root / step;
        const auto k = static_cast<std::size_t>(place);
        const double share = place - static_cast<double>(k);
        const auto between = [&](const std::vector<double>& v) {
            return v[k] + share * (v[k + 1] - v[k]);
        };
        return {between(t.low), between(t.high)};
    }
    // Amplitude^2 in quadrature variances is about degrees x ratio - degrees; its scatter is 1, to
    // which the noise's own uncertainty adds next to nothing here.
    const double amplitude = std::sqrt(degrees * ratio - (degrees - 1.0));
    const double reach =
        student_t_quantile(below_low, 2.0 * std::min(independent, most_independent));
    return {amplitude - reach, amplitude + reach};
}

double carrier_detection_ratio(double independent) {
    return independent * (std::pow(false_detection, -1.0 / independent) - 1.0);
}

double tone_detection_ratio(double independent) {
    return f_quantile(1.0 - false_detection, 4.0, 2.0 * independent);
}

} // namespace tonewalk
