// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <map>
#include <utility>
#include <vector>

#include "tonewalk/base/estimate.hpp"

namespace tonewalk {

/// 95 % limits of a line's amplitude from its power over the noise, where the noise itself was
/// estimated from K independent lines: inversion of line_power_cdf (maths), exact up to some 21 dB,
/// its limit (Student t) above. Tables are made when first needed and kept.
class amplitude_limits {
public:
    struct pair {
        double low = 0.0,
               high = 0.0; ///< amplitude over the noise's standard deviation in one quadrature
    };
    /// `ratio`: power found over noise power (noise included); `degrees`: 2 for one line, 4 for two
    /// added. low is 0 where nothing bounds the amplitude below.
    [[nodiscard]] pair operator()(double ratio, int degrees, double independent);

private:
    struct table {
        double nominal = 0.0;          // the K that it is made for
        double reach = 0.0;            // of Student's t
        std::vector<double> low, high; // powers at ratio = (k step)^2; NaN until needed
    };
    table& table_for(int degrees, double independent);
    std::map<std::pair<int, int>, table> tables_;
};

/// Detection threshold, p = 1e-3 a record: of |C|^2 over N, K(p^(-1/K) - 1).
[[nodiscard]] double carrier_detection_ratio(double independent);
/// Of |U|^2 + |L|^2 over 2 N: F(1 - p; 4, 2 K).
[[nodiscard]] double tone_detection_ratio(double independent);

} // namespace tonewalk
