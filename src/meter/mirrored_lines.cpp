// SPDX-License-Identifier: GPL-3.0-or-later
#include "mirrored_lines.hpp"

#include <cmath>
#include <complex>
#include <numbers>

namespace tonewalk {
namespace {

using std::numbers::pi;

/// Between the centres of weight of a Hann window's halves, in windows.
constexpr double halves_apart = 0.5 - 2.0 / (pi * pi);

/// In 8 fixed lanes, so that several are added at a time.
double dot(const run_values& a, const run_values& b) noexcept {
    constexpr std::size_t lanes = 8;
    std::array<double, lanes> sums{};
    for (std::size_t first = 0; first < run_samples; first += lanes) {
        for (std::size_t k = 0; k < lanes; ++k) {
            sums[k] += a[first + k] * b[first + k];
        }
    }
    return ((sums[0] + sums[4]) + (sums[2] + sums[6])) +
           ((sums[1] + sums[5]) + (sums[3] + sums[7]));
}

/// Sums of a run's samples times a table's and times its mirror image.
struct both_turned {
    cf64 forwards, backwards;
};
both_turned both_ways(const sample_runs::run& z, const sample_runs::run& table) noexcept {
    const double rr = dot(z.re, table.re), ii = dot(z.im, table.im);
    const double ri = dot(z.re, table.im), ir = dot(z.im, table.re);
    return {{rr - ii, ri + ir}, {rr + ii, ir - ri}};
}

/// `run` about 0 Hz, and its sum.
cf64 turn_down(sample_runs::run& run, const sample_runs::run& table) noexcept {
    const both_turned sums = both_ways(run, table);
    for (std::size_t k = 0; k < run_samples; ++k) {
        const double re = run.re[k], im = run.im[k];
        run.re[k] = re * table.re[k] - im * table.im[k];
        run.im[k] = re * table.im[k] + im * table.re[k];
    }
    return sums.forwards;
}

/// Of a line `hz` up, taken down to 0 Hz; phase 0 at the record's centre.
run_phasor downwards(double hz, double rate_hz, double centre) {
    const double turns = hz / rate_hz;
    return {-turns, std::polar(1.0, 2.0 * pi * turns * centre)};
}

} // namespace

mirrored_lines::mirrored_lines(double rate_hz, std::size_t record_samples,
                               const std::array<double, pairs>& off_carrier_hz)
    : rate_hz_{rate_hz}, centre_{static_cast<double>(record_samples) / 2.0},
      phasors_{downwards(off_carrier_hz[0], rate_hz_, centre_),
               downwards(off_carrier_hz[1], rate_hz_, centre_),
               downwards(off_carrier_hz[2], rate_hz_, centre_)} {}

mirrored_lines::reading mirrored_lines::read(const sample_runs& weighted, double carrier_hz) const {
    run_phasor down = downwards(carrier_hz, rate_hz_, centre_);
    std::array<run_phasor, pairs> off = phasors_;
    reading r;
    cf64 earlier{}; // the carrier in the record's first half
    double first = 0.0;
    for (sample_runs::run run : weighted.runs()) {
        const cf64 here = product(down.now(), turn_down(run, down.table()));
        r.carrier += here;
        earlier += first < centre_ ? here : cf64{};
        for (std::size_t k = 0; k < pairs; ++k) {
            const both_turned sums = both_ways(run, off[k].table());
            const cf64 up = product(down.now(), off[k].now());
            const cf64 low = product(down.now(), std::conj(off[k].now()));
            r.sides[k].upper += product(up, sums.forwards);
            r.sides[k].lower += product(low, sums.backwards);
            off[k].next_run();
        }
        down.next_run();
        first += static_cast<double>(run_samples);
    }
    const double turn = std::arg((r.carrier - earlier) * std::conj(earlier));
    r.offset_hz = turn / (2.0 * pi * halves_apart * 2.0 * centre_ / rate_hz_);
    return r;
}

} // namespace tonewalk
