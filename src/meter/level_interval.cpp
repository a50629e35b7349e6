// SPDX-License-Identifier: GPL-3.0-or-later
#include "level_interval.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

#include "tonewalk/maths/distribution.hpp"

namespace tonewalk {
namespace {

constexpr double step = 0.125;              // of the root of the ratio
constexpr double most_root = 12.0;          // 21.6 dB
constexpr double most_independent = 4000.0; // beyond, the noise counts as known
constexpr double false_detection = 1e-3;
constexpr double below_low = 0.975, below_high = 0.025;

} // namespace

amplitude_limits::table& amplitude_limits::table_for(int degrees, double independent) {
    const double k = std::clamp(independent, 2.0, most_independent);
    constexpr double buckets_per_e = 30.0; // about 3 % each
    const int bucket = static_cast<int>(std::lround(std::log(k) * buckets_per_e));
    const auto found = tables_.find({degrees, bucket});
    if (found != tables_.end()) {
        return found->second;
    }
    const double nominal = std::exp(bucket / buckets_per_e);
    const std::vector<double> unknown(static_cast<std::size_t>(most_root / step) + 2,
                                      std::numeric_limits<double>::quiet_NaN());
    table made{nominal, student_t_quantile(below_low, 2.0 * nominal), unknown, unknown};
    return tables_.emplace(std::pair{degrees, bucket}, std::move(made)).first->second;
}

amplitude_limits::pair amplitude_limits::operator()(double ratio, int degrees, double independent) {
    const double root = std::sqrt(std::max(0.0, ratio));
    table& t = table_for(degrees, independent);
    if (root >= most_root) {
        // The amplitude in quadrature deviations: all but normal here, its variance estimated.
        const double amplitude = std::sqrt(degrees * ratio - (degrees - 1.0));
        return {amplitude - t.reach, amplitude + t.reach};
    }
    const auto at = [&](std::vector<double>& values, std::size_t k, double p) {
        if (std::isnan(values[k])) {
            const double here = std::max(1e-4, static_cast<double>(k) * step);
            values[k] = line_power_inverse(here * here, p, degrees, 2.0 * t.nominal);
        }
        return values[k];
    };
    const double place = root / step;
    const auto k = static_cast<std::size_t>(place);
    const double share = place - static_cast<double>(k);
    // Either limit leaves zero as a power does, so that straight lines between powers are never
    // below the upper one, and those between amplitudes never above the lower one.
    const double low = std::lerp(std::sqrt(at(t.low, k, below_low)),
                                 std::sqrt(at(t.low, k + 1, below_low)), share);
    const double high =
        std::sqrt(std::lerp(at(t.high, k, below_high), at(t.high, k + 1, below_high), share));
    return {low, high};
}

double carrier_detection_ratio(double independent) {
    return independent * (std::pow(false_detection, -1.0 / independent) - 1.0);
}

/// P(F(4, 2K) > x) = y^K (1 + K (1 - y)) with y = K / (K + 2x), in closed form. Newton's steps for
/// u = K (1 - y), from above: the logarithm of that probability is concave in u.
double tone_detection_ratio(double independent) {
    constexpr double known_noise = 9.2335; // u where K is endless
    constexpr int steps = 60;
    const double k = independent;
    double u = std::min(known_noise, k * (1.0 - 1e-12));
    for (int n = 0; n < steps; ++n) {
        const double excess = k * std::log1p(-u / k) + std::log1p(u) - std::log(false_detection);
        const double change = excess / (1.0 / (1.0 + u) - 1.0 / (1.0 - u / k));
        u -= change;
        if (std::abs(change) < 1e-12 * u) {
            break;
        }
    }
    return u / (2.0 * (1.0 - u / k));
}

} // namespace tonewalk
