// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>

namespace tonewalk {

/// A level ratio in decibels; made only from a ratio whose kind is named, so that ten-log and
/// twenty-log cannot be confused. A ratio of 0 gives minus infinity, a negative or NaN ratio gives
/// NaN.
class decibel {
public:
    static decibel from_power_ratio(double ratio) noexcept {
        return decibel{10.0 * std::log10(ratio)};
    }
    static decibel from_amplitude_ratio(double ratio) noexcept {
        return decibel{20.0 * std::log10(ratio)};
    }
    static decibel from_db(double db) noexcept {
        return decibel{db};
    } ///< a value that already is in dB
    [[nodiscard]] double db() const noexcept { return db_; }
    [[nodiscard]] double power_ratio() const noexcept { return std::pow(10.0, db_ / 10.0); }
    [[nodiscard]] double amplitude_ratio() const noexcept { return std::pow(10.0, db_ / 20.0); }

private:
    explicit decibel(double db) noexcept : db_{db} {}
    double db_;
};

} // namespace tonewalk
