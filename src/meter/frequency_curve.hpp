// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <deque>
#include <optional>
#include <vector>

namespace tonewalk {

/// What one record knows of the carrier's frequency.
struct frequency_reading {
    double time_s = 0.0;
    double hz = 0.0;     ///< own frequency of the record, baseband
    double weight = 0.0; ///< carrier power; only records at 20 dB line SNR and more are given
};

/// The carrier's frequency as one smooth curve: a knot every 5 s, each a robust, power-weighted
/// straight-line fit to the readings within 5 s of it; straight lines between knots. Where no
/// reading stands the last value is held. Streams: a knot is known once time has passed 5 s beyond
/// it.
class frequency_curve {
public:
    explicit frequency_curve(double opening_hz) : last_hz_{opening_hz} {}
    void add(const frequency_reading&);
    /// No reading before `time_s` will come any more.
    void advance(double time_s);
    /// The curve is final before this time.
    [[nodiscard]] double known_until_s() const noexcept;
    struct value {
        double hz = 0.0;
        double unknown_hz = 0.0; ///< how far it may be off where it was held
    };
    /// `time_s` below known_until_s(), or any time after the last advance (then the last value is
    /// held).
    [[nodiscard]] value at(double time_s) const noexcept;
    [[nodiscard]] double provisional_hz() const noexcept {
        return provisional_hz_.value_or(last_hz_);
    }

private:
    struct knot {
        double time_s = 0.0, hz = 0.0, unknown_hz = 0.0;
    };
    void make_knot(double time_s);
    std::deque<frequency_reading> readings_;
    std::vector<knot> knots_; // ascending, 5 s apart
    std::optional<double> provisional_hz_;
    double last_hz_; // of the last knot with readings, or the opening's
    double last_reading_s_ = 0.0;
    bool any_ = false;
    double steepest_hz_s_ = 0.0; // of the fits so far
};

} // namespace tonewalk
