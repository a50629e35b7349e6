// SPDX-License-Identifier: GPL-3.0-or-later
#include "checking.hpp"

#include <cmath>
#include <span>

#include <fmt/format.h>

#include "timing.hpp"
#include "tuning.hpp"

namespace tonewalk {
namespace {

constexpr double most_db = 300.0; // of any level: far beyond every format
constexpr double most_samples = 1e15;
constexpr double most_truth_points = 1e7;

std::string item(const std::string& table, std::string_view name, std::size_t index) {
    return fmt::format("{}{}{}[{}]", table, table.empty() ? "" : ".", name, index);
}

/// The rules of one table of the scene.
class rules {
public:
    rules(const scene_complaint& complain, std::string table)
        : complain_{complain}, table_{std::move(table)} {}

    [[nodiscard]] const std::string& table() const noexcept { return table_; }
    [[nodiscard]] rules inside(std::string_view name, std::size_t index) const {
        return {complain_, item(table_, name, index)};
    }
    [[nodiscard]] rules inside(std::string_view name) const {
        return {complain_, table_.empty() ? std::string{name} : fmt::format("{}.{}", table_, name)};
    }

    void need(bool holds, std::string_view key, std::string_view what,
              std::string_view mend) const {
        if (!holds)
            throw complain_(table_, key, what, mend);
    }
    void finite(std::string_view key, double value) const {
        need(std::isfinite(value), key, "is not a number", "give a finite number");
    }
    void above(std::string_view key, double value, double least) const {
        need(std::isfinite(value) && value > least, key, fmt::format("is {:g}", value),
             fmt::format("give a number above {:g}", least));
    }
    void between(std::string_view key, double value, double least, double most) const {
        need(value >= least && value <= most, key, fmt::format("is {:g}", value),
             fmt::format("give {:g} to {:g}", least, most));
    }
    void level(std::string_view key, double db) const {
        need(std::isinf(db) || std::fabs(db) <= most_db, key, fmt::format("is {:g} dB", db),
             fmt::format("give -{0:g} to {0:g} dB", most_db));
    }
    void times(std::string_view key, std::span<const scene_point> points) const {
        for (std::size_t k = 0; k < points.size(); ++k) {
            const rules point = inside(key, k);
            point.finite("time_s", points[k].time_s);
            point.finite("value", points[k].value);
            point.need(k == 0 || points[k].time_s > points[k - 1].time_s, "time_s",
                       "does not come after the point before", "put the points in order of time");
        }
    }

private:
    const scene_complaint& complain_;
    std::string table_;
};

void check_on_times(const rules& rule, double start_s, double stop_s) {
    rule.need(start_s < stop_s, "stop_s", "is not after start_s", "give a later stop_s");
}

void check_tone(const rules& rule, const scene_tone& tone) {
    rule.above("frequency_hz", tone.frequency_hz, 0.0);
    rule.between("depth_percent", tone.depth_percent, 0.0, 1000.0);
    rule.finite("phase_deg", tone.phase_deg);
    rule.between("incidental_rad", tone.incidental_rad, 0.0, 10.0);
    rule.finite("incidental_phase_deg", tone.incidental_phase_deg);
    check_on_times(rule, tone.start_s, tone.stop_s);
    for (std::size_t k = 0; k < tone.harmonics.size(); ++k) {
        const rules harmonic = rule.inside("harmonic", k);
        harmonic.between("order", tone.harmonics[k].order, 2, 1000);
        harmonic.between("percent", tone.harmonics[k].percent, 0.0, 1000.0);
        harmonic.finite("phase_deg", tone.harmonics[k].phase_deg);
    }
}

void check_waves(const rules& rule, const scene& whole, const scene_carrier& carrier) {
    const bool moving = whole.path.speed_m_s != 0.0 || !whole.path.points.empty();
    rule.need(carrier.waves.empty() || !moving || whole.centre_hz, "wave",
              "has no wavelength: the path moves and no centre is known",
              "add centre_hz to [recording]");
    for (std::size_t k = 0; k < carrier.waves.size(); ++k) {
        const rules wave = rule.inside("wave", k);
        wave.between("amplitude", carrier.waves[k].amplitude, 0.0, 1e6);
        wave.finite("phase_deg", carrier.waves[k].phase_deg);
        wave.finite("direction_deg", carrier.waves[k].direction_deg);
        wave.between("delay_s", carrier.waves[k].delay_s, 0.0, 1.0);
    }
}

void check_under_resonator(const rules& rule, const scene_carrier& carrier) {
    constexpr std::string_view what = "cannot pass a resonator, which shapes tones and hum alone";
    rule.need(carrier.speech_percent == 0.0, "speech_percent", what,
              "take it or the resonator away");
    rule.need(carrier.overmodulation == overmodulation::fold, "overmodulation", what,
              "use \"fold\" or take the resonator away");
    for (std::size_t k = 0; k < carrier.tones.size(); ++k)
        rule.inside("tone", k).need(carrier.tones[k].incidental_rad == 0.0, "incidental_rad", what,
                                    "take it or the resonator away");
}

void check_place(const rules& rule, const scene& whole, const scene_carrier& carrier) {
    bool somewhere = false;
    for (const scene_stretch& stretch : scene_layout(whole))
        somewhere = somewhere || tuned(whole, carrier, stretch.centre_hz).has_value();
    const double least_hz = whole.format.is_complex ? -whole.rate_hz / 2.0 : 0.0;
    rule.need(
        somewhere, "offset_hz",
        fmt::format("is {:g}: the carrier and its sidebands leave the band of {:g} to {:g} Hz",
                    carrier.offset_hz, least_hz, whole.rate_hz / 2.0),
        "move the carrier, lower the tones or raise rate_hz");
    rule.need(!whole.centre_hz || *whole.centre_hz + carrier.offset_hz > 0.0, "offset_hz",
              "puts the carrier at or below 0 Hz", "raise centre_hz or offset_hz");
}

void check_antennas(const rules& rule, const scene_carrier& carrier) {
    if (carrier.polarization) {
        const rules field = rule.inside("polarization");
        field.between("axial_ratio_db", carrier.polarization->axial_ratio_db, 0.0, scene_beyond);
        field.finite("tilt_deg", carrier.polarization->tilt_deg);
        field.between("isolation_db", carrier.polarization->isolation_db, 0.0, scene_beyond);
        field.finite("isolation_phase_deg", carrier.polarization->isolation_phase_deg);
    }
    if (carrier.pattern) {
        const rules lobe = rule.inside("pattern");
        lobe.finite("bearing_deg", carrier.pattern->bearing_deg);
        lobe.between("front_to_back_db", carrier.pattern->front_to_back_db, 0.0, scene_beyond);
    }
}

void check_carrier(const rules& rule, const scene& whole, const scene_carrier& carrier) {
    rule.finite("offset_hz", carrier.offset_hz);
    rule.level("level_dbfs", carrier.level_dbfs);
    rule.finite("phase_deg", carrier.phase_deg);
    rule.finite("drift_hz_s", carrier.drift_hz_s);
    rule.between("wobble_hz", carrier.wobble_hz, 0.0, whole.rate_hz);
    rule.above("wobble_period_s", carrier.wobble_period_s, 0.0);
    rule.level("phase_noise_dbc_hz", carrier.phase_noise_dbc_hz);
    rule.above("phase_noise_offset_hz", carrier.phase_noise_offset_hz, 0.0);
    rule.between("speech_percent", carrier.speech_percent, 0.0, 1000.0);
    check_on_times(rule, carrier.start_s, carrier.stop_s);
    for (std::size_t k = 0; k < carrier.tones.size(); ++k)
        check_tone(rule.inside("tone", k), carrier.tones[k]);
    for (std::size_t k = 0; k < carrier.hum.size(); ++k) {
        const rules hum = rule.inside("hum", k);
        hum.above("frequency_hz", carrier.hum[k].frequency_hz, 0.0);
        hum.between("depth_percent", carrier.hum[k].depth_percent, 0.0, 1000.0);
        hum.finite("phase_deg", carrier.hum[k].phase_deg);
    }
    check_waves(rule, whole, carrier);
    rule.times("fade", carrier.fades);
    for (std::size_t k = 0; k < carrier.fades.size(); ++k)
        rule.inside("fade", k).level("level_db", carrier.fades[k].value);
    check_antennas(rule, carrier);
    check_place(rule, whole, carrier);
    if (whole.path.resonator)
        check_under_resonator(rule, carrier);
}

void check_path(const rules& rule, const scene& whole) {
    const scene_path& path = whole.path;
    rule.finite("speed_m_s", path.speed_m_s);
    rule.finite("begin_m", path.begin_m);
    rule.finite("rotation_deg_s", path.rotation_deg_s);
    rule.finite("begin_deg", path.begin_deg);
    rule.times("point", path.points);
    rule.times("angle", path.angles);
    if (!path.resonator)
        return;
    const rules resonator = rule.inside("resonator");
    resonator.need(whole.centre_hz.has_value(), "mode", "has no place: no centre is known",
                   "add centre_hz to [recording]");
    resonator.between("leak", path.resonator->leak, 0.0, 1e6);
    resonator.finite("leak_phase_deg", path.resonator->leak_phase_deg);
    for (std::size_t k = 0; k < path.resonator->modes.size(); ++k) {
        const rules mode = resonator.inside("mode", k);
        mode.above("frequency_hz", path.resonator->modes[k].frequency_hz, 0.0);
        mode.above("q_loaded", path.resonator->modes[k].q_loaded, 0.0);
        mode.between("amplitude", path.resonator->modes[k].amplitude, 0.0, 1e6);
        mode.finite("phase_deg", path.resonator->modes[k].phase_deg);
    }
}

void check_gain(const rules& rule, const scene_receiver& receiver, double rate_hz) {
    for (std::size_t k = 0; k < receiver.gain_steps.size(); ++k) {
        const rules step = rule.inside("gain_step", k);
        step.finite("time_s", receiver.gain_steps[k].time_s);
        step.level("gain_db", receiver.gain_steps[k].gain_db);
        step.need(k == 0 || receiver.gain_steps[k].time_s > receiver.gain_steps[k - 1].time_s,
                  "time_s", "does not come after the step before",
                  "put the steps in order of time");
    }
    if (!receiver.gain_control)
        return;
    const rules control = rule.inside("gain_control");
    const double quickest_s = 10.0 / rate_hz; // keeps the loop stable at its largest excess
    control.between("target_dbfs", receiver.gain_control->target_dbfs, -most_db, most_db);
    control.between("attack_s", receiver.gain_control->attack_s, quickest_s, 1e6);
    control.between("release_s", receiver.gain_control->release_s, quickest_s, 1e6);
    control.between("least_db", receiver.gain_control->least_db, -most_db, most_db);
    control.between("most_db", receiver.gain_control->most_db, receiver.gain_control->least_db,
                    most_db);
    control.between("begin_db", receiver.gain_control->begin_db, receiver.gain_control->least_db,
                    receiver.gain_control->most_db);
}

void check_gaps(const rules& rule, const scene& whole) {
    double free_from_s = 0.0;
    for (std::size_t k = 0; k < whole.receiver.gaps.size(); ++k) {
        const scene_gap& gap = whole.receiver.gaps[k];
        const rules lost = rule.inside("gap", k);
        lost.above("start_s", gap.start_s, free_from_s);
        lost.need(gap.samples > 0 || samples_in(gap.duration_s, whole.rate_hz) > 0, "duration_s",
                  "is shorter than a sample", "give duration_s or samples");
        free_from_s =
            gap.start_s +
            (gap.samples > 0 ? static_cast<double>(gap.samples) / whole.rate_hz : gap.duration_s);
        lost.need(free_from_s < scene_span_s(whole), "start_s",
                  "reaches beyond the end of the recording", "place it earlier");
    }
}

void check_receiver(const rules& rule, const scene& whole) {
    const scene_receiver& receiver = whole.receiver;
    rule.level("noise_dbfs_hz", receiver.noise_dbfs_hz);
    rule.level("compression_dbfs", receiver.compression_dbfs);
    rule.between("iq_gain_error_db", receiver.iq_gain_error_db, -20.0, 20.0);
    rule.between("iq_phase_error_deg", receiver.iq_phase_error_deg, -80.0, 80.0);
    rule.level("dc_dbfs", receiver.dc_dbfs);
    rule.finite("dc_phase_deg", receiver.dc_phase_deg);
    rule.level("clip_dbfs", receiver.clip_dbfs);
    check_gain(rule, receiver, whole.rate_hz);
    for (std::size_t k = 0; k < receiver.spurs.size(); ++k) {
        const rules spur = rule.inside("spur", k);
        spur.between("offset_hz", receiver.spurs[k].offset_hz, -whole.rate_hz / 2.0,
                     whole.rate_hz / 2.0);
        spur.level("level_dbfs", receiver.spurs[k].level_dbfs);
        spur.finite("phase_deg", receiver.spurs[k].phase_deg);
    }
    rule.between("noise_lsb_rms", receiver.noise_lsb_rms, 0.0, 1e6);
    rule.need(receiver.noise_lsb_rms == 0.0 || !whole.format.is_float(), "noise_lsb_rms",
              "has no meaning for floating-point samples", "use noise_dbfs_hz");
    rule.need(receiver.iq_gain_error_db == 0.0 || whole.format.is_complex, "iq_gain_error_db",
              "has no meaning for real samples", "take it away");
    rule.need(receiver.iq_phase_error_deg == 0.0 || whole.format.is_complex, "iq_phase_error_deg",
              "has no meaning for real samples", "take it away");
    check_gaps(rule, whole);
    for (std::size_t k = 0; k < receiver.non_finite.size(); ++k) {
        const rules bad = rule.inside("non_finite", k);
        bad.need(whole.format.is_float(), "first", "has no code in integer samples",
                 "choose a format such as cf32_le");
        bad.need(receiver.non_finite[k].first >= 0 && receiver.non_finite[k].count > 0 &&
                     receiver.non_finite[k].first < stored_samples(whole),
                 "first", "is outside the recording", "give the index of a stored sample");
    }
}

void check_recording(const rules& rule, const scene& whole) {
    rule.between("rate_hz", whole.rate_hz, 1.0, 1e12);
    if (whole.centre_hz)
        rule.between("centre_hz", *whole.centre_hz, -1e12, 1e12);
    rule.above("truth_every_s", whole.truth_every_s, 0.0);
    rule.between("duration_s", whole.duration_s, 0.0, most_samples / whole.rate_hz);
    rule.between("samples", static_cast<double>(whole.samples), 0.0, most_samples);
    double span_s = whole.duration_s;
    for (std::size_t k = 0; k < whole.segments.size(); ++k) {
        const rules segment = rule.inside("segment", k);
        segment.between("duration_s", whole.segments[k].duration_s, 0.0,
                        most_samples / whole.rate_hz);
        segment.between("lost_s", whole.segments[k].lost_s, 0.0, most_samples / whole.rate_hz);
        segment.between("samples", static_cast<double>(whole.segments[k].samples), 0.0,
                        most_samples);
        segment.need(!whole.segments[k].centre_hz || whole.centre_hz, "centre_hz", "stands alone",
                     "add centre_hz to [recording] too");
        span_s += whole.segments[k].duration_s + whole.segments[k].lost_s;
    }
    rule.need(stored_samples(whole) > 0, "duration_s", "gives no sample",
              "give duration_s or samples");
    rule.need(span_s / whole.truth_every_s <= most_truth_points, "truth_every_s",
              "makes too long a series", "give a larger spacing");
}

} // namespace

void check_scene(const scene& whole, const scene_complaint& complain) {
    const rules top{complain, ""};
    check_recording(top, whole);
    check_path(top.inside("path"), whole);
    check_receiver(top.inside("receiver"), whole);
    for (std::size_t k = 0; k < whole.carriers.size(); ++k)
        check_carrier(top.inside("carrier", k), whole, whole.carriers[k]);
}

void check_scene(const scene& whole, const std::string& where) {
    check_scene(whole, [&](const std::string& table, std::string_view key, std::string_view what,
                           std::string_view mend) {
        return error{fault::malformed, what,
                     fmt::format("{}, {}{}{}", where, table, table.empty() ? "" : ".", key), mend};
    });
}

} // namespace tonewalk
