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
    double weight = 0.0; ///< carrier power of a record at 20 dB line SNR or more; else 0: nothing
};

/// The carrier's frequency as one smooth curve: a knot every 5 s, each a robust, power-weighted
/// straight-line fit to the readings within 5 s of it; straight lines between knots. Where no
/// reading stands the last value is held. Streams: a knot is known once time has passed 5 s beyond
/// it.
class frequency_curve {
public:
    /// What the opening said holds, to within `opening_unknown_hz`, where no reading ever stands.
    frequency_curve(double opening_hz, double opening_unknown_hz)
        : opening_unknown_hz_{opening_unknown_hz}, last_hz_{opening_hz} {}
    void add(const frequency_reading&);
    /// No reading before `time_s` will come any more.
    void advance(double time_s);
    /// The curve is final before this time.
    [[nodiscard]] double known_until_s() const noexcept;
    struct value {
        double hz = 0.0;
        double slope_hz_s = 0.0;
        double unknown_hz = 0.0; ///< how far it may be off where it was held
    };
    /// `time_s` below known_until_s(), or any time after the last advance (then the last value is
    /// held).
    [[nodiscard]] value at(double time_s) const noexcept;
    /// What the readings so far say, for a first look at the next record.
    [[nodiscard]] double provisional_hz() const noexcept {
        return provisional_hz_.value_or(last_hz_);
    }
    /// Whether a reading stands within 5 s before `time_s`.
    [[nodiscard]] bool is_fresh(double time_s) const noexcept;

private:
    struct knot {
        double time_s = 0.0, hz = 0.0, unknown_hz = 0.0;
    };
    void make_knot(double time_s);
    void begin_with(double hz, double slope_hz_s, double first_reading_s);
    double opening_unknown_hz_;
    std::deque<frequency_reading> readings_;
    std::vector<knot> knots_; // ascending, 5 s apart
    std::optional<double> provisional_hz_;
    double last_hz_; // of the last knot with readings, or the opening's
    std::optional<double> last_reading_s_;
    double last_fitted_s_ = 0.0; // the last reading that a knot has used
    bool any_ = false;
    double steepest_hz_s_ = 0.0; // of the fits so far
};

} // namespace tonewalk
