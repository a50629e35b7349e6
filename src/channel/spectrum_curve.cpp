// SPDX-License-Identifier: GPL-3.0-or-later
#include "spectrum_curve.hpp"

#include <algorithm>

namespace tonewalk {

curve spectrum_curve(const line_spectrum& spectrum, const stream_facts& facts,
                     double centre_shift_hz) {
    constexpr std::size_t most_points = 1024;
    curve c;
    c.name = "spectrum";
    c.kind = "line";
    c.x_unit = "Hz";
    c.y_unit = "dBFS";
    const std::size_t first = facts.format.is_complex ? 0 : spectrum.size() / 2;
    const std::size_t run = std::max<std::size_t>(1, (spectrum.size() - first) / most_points);
    for (std::size_t k = first; k < spectrum.size();
         k += run) { // the highest of each run: no line is lost
        std::size_t best = k;
        for (std::size_t m = k; m < std::min(k + run, spectrum.size()); ++m) {
            best = spectrum.power(m) > spectrum.power(best) ? m : best;
        }
        c.x.push_back(spectrum.hz_of(static_cast<double>(best)) + centre_shift_hz);
        c.y.push_back(decibel::from_power_ratio(std::max(spectrum.power(best), 1e-30)).db());
    }
    return c;
}

} // namespace tonewalk
