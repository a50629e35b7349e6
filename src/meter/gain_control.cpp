// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/gain_control.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <optional>
#include <vector>

#include <fmt/core.h>

#include "tonewalk/maths/quantile.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

constexpr double least_step_db = 0.4;
constexpr double least_control_db = 0.5;
// A whole log is searched: 1.96 would find steps and slopes anywhere.
constexpr double step_sigmas = 4.0;    // of the noise
constexpr double carrier_sigmas = 3.0; // of the carrier's step, where the noise steps as well
constexpr double control_sigmas = 5.0;
constexpr double step_side_s = 10.0;
constexpr std::size_t least_side = 20;    // records on either side of a step
constexpr std::size_t least_records = 30; // for gain control
constexpr std::size_t least_group = 10;   // of records below or above a carrier level
constexpr double least_range_db = 6.0;    // of the carrier, to judge gain control

/// Carrier and noise of the records that told both, in decibels.
struct level_pair {
    double time_s = 0.0, carrier_db = 0.0, carrier_sigma_db = 0.0, noise_db = 0.0;
    std::uint32_t stretch = 0;
};

std::vector<level_pair> pairs_of(const level_log& log) {
    std::vector<level_pair> pairs;
    for (const level_record& r : log.records) {
        if (!std::isnan(r.carrier_dbfs.value) && r.noise_power > 0.0) {
            const double relative = r.carrier.sigma / std::sqrt(r.carrier.power);
            pairs.push_back({r.time_s, r.carrier_dbfs.value, 20.0 / std::numbers::ln10 * relative,
                             10.0 * std::log10(r.noise_power), r.stretch});
        }
    }
    return pairs;
}

struct mean_and_error {
    double mean = 0.0, error = 0.0;
    [[nodiscard]] bool exceeds(double sigmas) const { return std::abs(mean) > sigmas * error; }
};

mean_and_error difference(const mean_and_error& a, const mean_and_error& b) {
    return {a.mean - b.mean, std::hypot(a.error, b.error)};
}

/// Means of the noise over runs of records, from sums up to each. Neighbours overlap and scatter
/// together: `inflation` of them tell what one would.
class noise_means {
public:
    noise_means(const std::vector<level_pair>& pairs, double inflation) : inflation_{inflation} {
        for (const level_pair& p : pairs) {
            middle_ += p.noise_db / static_cast<double>(pairs.size());
        }
        for (const level_pair& p : pairs) {
            const double x = p.noise_db - middle_;
            sums_.push_back(sums_.back() + x);
            squares_.push_back(squares_.back() + x * x);
        }
    }
    /// Of records [first, past), two at least; the error is the scatter's.
    [[nodiscard]] mean_and_error over(std::size_t first, std::size_t past) const {
        const auto n = static_cast<double>(past - first);
        const double mean = (sums_[past] - sums_[first]) / n;
        const double variance =
            std::max(0.0, (squares_[past] - squares_[first]) / n - mean * mean) * n / (n - 1.0);
        return {middle_ + mean, std::sqrt(variance / n * inflation_)};
    }

private:
    double inflation_, middle_ = 0.0;
    std::vector<double> sums_{0.0}, squares_{0.0};
};

// ---- steps ----

/// By how much the carrier steps between two records, however it fades: differences of records on
/// either side, nearest first, weighted so that a fade that bends like a polynomial of degree 0, 2,
/// 4 or 6 falls out.
constexpr std::size_t step_orders = 4;
constexpr std::array<std::array<double, step_orders>, step_orders> step_weights{{
    {1.0, 0.0, 0.0, 0.0},
    {3.0 / 2.0, -1.0 / 2.0, 0.0, 0.0},
    {10.0 / 6.0, -5.0 / 6.0, 1.0 / 6.0, 0.0},
    {35.0 / 20.0, -21.0 / 20.0, 7.0 / 20.0, -1.0 / 20.0},
}};

/// Whether [first, last] are neighbours in time, none missing.
bool are_unbroken(const std::vector<level_pair>& pairs, std::size_t first, std::size_t last,
                  double every_s) {
    const double longest_s = (static_cast<double>(last - first) + 0.5) * every_s;
    return pairs[first].stretch == pairs[last].stretch &&
           pairs[last].time_s - pairs[first].time_s < longest_s;
}

/// Between record k and the one `across` further on. Of two orders the step itself falls out of the
/// difference: it is what the lower one leaves of the fade. The surest order counts.
std::optional<mean_and_error> carrier_step(const std::vector<level_pair>& pairs, std::size_t k,
                                           std::size_t across, double every_s) {
    const std::size_t reach = (step_orders - 1) * across;
    if (k < reach || k + across + reach >= pairs.size() ||
        !are_unbroken(pairs, k - reach, k + across + reach, every_s)) {
        return std::nullopt;
    }
    std::array<double, step_orders> steps{}, noise{};
    for (std::size_t order = 0; order < step_orders; ++order) {
        for (std::size_t n = 0; n <= order; ++n) {
            const level_pair &after = pairs[k + across + n * across],
                             &before = pairs[k - n * across];
            const double weight = step_weights[order][n];
            steps[order] += weight * (after.carrier_db - before.carrier_db);
            noise[order] = std::hypot(noise[order], weight * after.carrier_sigma_db,
                                      weight * before.carrier_sigma_db);
        }
    }
    mean_and_error best{steps[0], std::hypot(noise[0], steps[1] - steps[0])};
    for (std::size_t order = 1; order + 1 < step_orders; ++order) {
        const double error = std::hypot(noise[order], steps[order + 1] - steps[order]);
        if (error < best.error) {
            best = {steps[order], error};
        }
    }
    return best;
}

struct gain_step {
    double db = 0.0, time_s = 0.0, sigmas = 0.0; // sigmas: of the noise's step alone
};

/// The one step that both show, weighted by what each knows.
double both(const mean_and_error& carrier, const mean_and_error& noise) {
    const double c = carrier.error * carrier.error, n = noise.error * noise.error;
    return c + n > 0.0 ? (carrier.mean * n + noise.mean * c) / (c + n) : carrier.mean;
}

bool are_alike(const mean_and_error& carrier, const mean_and_error& noise) {
    constexpr double least_difference_db = 0.15, sigmas = 4.0;
    const mean_and_error apart = difference(carrier, noise);
    return std::abs(apart.mean) < std::max(least_difference_db, sigmas * apart.error);
}

/// A step of the receiver's gain moves carrier and noise together by the same amount within one
/// window. The one that stands out most.
gain_step find_gain_step(const std::vector<level_pair>& pairs, const noise_means& noise,
                         const level_log& log) {
    const auto side = static_cast<std::size_t>(std::max(4.0, step_side_s / log.every_s));
    const auto across = // two windows that hardly overlap
        std::max<std::size_t>(2, static_cast<std::size_t>(std::ceil(log.window_s / log.every_s)));
    gain_step best;
    for (std::size_t k = least_side; k + across + least_side < pairs.size(); ++k) {
        const std::optional<mean_and_error> carrier = carrier_step(pairs, k, across, log.every_s);
        if (!carrier || !carrier->exceeds(carrier_sigmas)) {
            continue;
        }
        const std::size_t after = k + across;
        const mean_and_error step =
            difference(noise.over(after, std::min(pairs.size(), after + side)),
                       noise.over(k + 1 > side ? k + 1 - side : 0, k + 1));
        const double step_db = both(*carrier, step), sigmas = std::abs(step.mean) / step.error;
        if (std::abs(step_db) >= least_step_db && step.exceeds(step_sigmas) &&
            are_alike(*carrier, step) && sigmas > best.sigmas) {
            best = {step_db, 0.5 * (pairs[k].time_s + pairs[after].time_s), sigmas};
        }
    }
    return best;
}

// ---- control ----

struct noise_rise {
    double db = 0.0, sigmas = 0.0;
    double range_db = 0.0;   // of the carrier
    double visible_db = 0.0; // the least rise that would have been significant
};

/// A straight line through the noise over the carrier: a gain that follows all along.
mean_and_error rise_of_line(const std::vector<level_pair>& pairs, double range_db,
                            double inflation) {
    const auto n = static_cast<double>(pairs.size());
    double mean_c = 0.0, mean_n = 0.0;
    for (const level_pair& p : pairs) {
        mean_c += p.carrier_db / n;
        mean_n += p.noise_db / n;
    }
    double cc = 0.0, cn = 0.0, nn = 0.0;
    for (const level_pair& p : pairs) {
        cc += (p.carrier_db - mean_c) * (p.carrier_db - mean_c);
        cn += (p.carrier_db - mean_c) * (p.noise_db - mean_n);
        nn += (p.noise_db - mean_n) * (p.noise_db - mean_n);
    }
    const double slope = cn / cc;
    const double variance = std::max(0.0, nn - slope * cn) / (n - 2.0) / cc * inflation;
    return {-slope * range_db, std::sqrt(variance) * range_db};
}

/// Two levels of noise, below and above some carrier level: a gain that reaches its stops. The
/// split that shows most.
mean_and_error rise_of_split(const noise_means& by_carrier, std::size_t records) {
    mean_and_error best{0.0, 1.0};
    for (std::size_t k = least_group; k + least_group <= records; ++k) {
        const mean_and_error rise = difference(by_carrier.over(0, k), by_carrier.over(k, records));
        if (rise.mean * best.error > best.mean * rise.error) {
            best = rise;
        }
    }
    return best;
}

noise_rise find_noise_rise(std::vector<level_pair> pairs, double inflation) {
    noise_rise found;
    std::stable_sort(pairs.begin(), pairs.end(), [](const level_pair& a, const level_pair& b) {
        return a.carrier_db < b.carrier_db;
    });
    std::vector<double> carriers;
    for (const level_pair& p : pairs) {
        carriers.push_back(p.carrier_db);
    }
    found.range_db = quantile_sorted(carriers, 0.98) - quantile_sorted(carriers, 0.02);
    if (found.range_db <= 0.0) {
        return found;
    }
    const noise_means by_carrier{pairs, inflation};
    const mean_and_error line = rise_of_line(pairs, found.range_db, inflation);
    const std::size_t half = pairs.size() / 2;
    found.visible_db =
        control_sigmas *
        difference(by_carrier.over(0, half), by_carrier.over(half, pairs.size())).error;
    for (const mean_and_error& rise : {line, rise_of_split(by_carrier, pairs.size())}) {
        if (rise.mean > found.db && rise.mean > control_sigmas * rise.error) {
            found.db = rise.mean;
        }
        found.sigmas = std::max(found.sigmas, rise.mean / rise.error);
    }
    found.db = found.db > 0.0 ? found.db : line.mean;
    return found;
}

note control_note(const gain_control_result& r) {
    return {note_code::agc_suspected, severity::warning, r.evidence,
            "switch the receiver's gain control off and record again; fades are deeper than "
            "shown"};
}

note step_note(const gain_control_result& r) {
    return {note_code::gain_step, severity::warning,
            fmt::format("carrier and noise step together by {:+.2f} dB at {:.1f} s", r.step_db,
                        r.step_s),
            "the receiver's gain changed; levels before and after do not compare"};
}

void judge(gain_control_result& r, const noise_rise& rise) {
    r.carrier_range_db = rise.range_db;
    if (rise.range_db < least_range_db) {
        r.evidence = fmt::format("the carrier moves by {:.1f} dB only: gain control would not show",
                                 rise.range_db);
        return;
    }
    if (rise.sigmas <= control_sigmas && rise.visible_db > least_control_db) {
        r.evidence = fmt::format("the noise scatters too much to show gain control below {:.1f} dB",
                                 rise.visible_db);
        return;
    }
    r.judged = true;
    r.noise_rise_db = rise.db;
    r.suspected = rise.sigmas > control_sigmas && rise.db >= least_control_db;
    r.evidence = r.suspected
                     ? fmt::format("the noise rises by {:.1f} dB as the carrier falls by {:.1f} dB",
                                   rise.db, rise.range_db)
                     : fmt::format("the noise stays within {:.1f} dB as the carrier falls by "
                                   "{:.1f} dB",
                                   std::max(0.1, std::abs(rise.db)), rise.range_db);
}

} // namespace

gain_control_result judge_gain_control(const level_log& log, bool compressed) {
    gain_control_result r;
    const std::vector<level_pair> pairs = pairs_of(log);
    if (pairs.size() < least_records) {
        r.evidence = "too few records show carrier and noise";
        return r;
    }
    const double inflation = hann_overlap_inflation(log.every_s / log.window_s).power;
    const gain_step step = find_gain_step(pairs, noise_means{pairs, inflation}, log);
    const noise_rise rise = find_noise_rise(pairs, inflation);
    judge(r, rise);
    if (compressed && r.suspected) {
        r.judged = r.suspected = false;
        r.evidence =
            "the receiver squeezes strong signals, which takes the noise down with them as "
            "gain control would";
    }
    // One gain that moves can look like both: it is what explains more of the noise.
    if (step.sigmas > 0.0 && (!r.suspected || step.sigmas > rise.sigmas)) {
        r.step_db = step.db;
        r.step_s = step.time_s;
        r.suspected = false;
        const note found = step_note(r);
        r.evidence = found.text;
        r.doubts.add(found);
    } else if (r.suspected) {
        r.doubts.add(control_note(r));
    }
    return r;
}

sheet describe(const gain_control_result& r) {
    sheet s;
    s.add("suspected", "", r.judged ? cell{r.suspected} : cell{});
    s.add("evidence", "", r.evidence);
    return s;
}

} // namespace tonewalk
