// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>
#include <map>
#include <string>
#include <utility>

#include <fmt/format.h>

#include "checking.hpp"
#include "tonewalk/base/near_name.hpp"
#include "tonewalk/base/text.hpp"
#include "tonewalk/base/toml.hpp"
#include "tonewalk/scene/make_recording.hpp"

namespace tonewalk {
namespace {

// What the file does not say keeps the default that scene.hpp states.
void take(const toml_table& from, std::string_view key, double& into) {
    into = from.number(key).value_or(into);
}
void take(const toml_table& from, std::string_view key, std::optional<double>& into) {
    into = from.number(key);
}
void take(const toml_table& from, std::string_view key, sample_index& into) {
    into = from.whole(key).value_or(into);
}
void take(const toml_table& from, std::string_view key, bool& into) {
    into = from.yes_no(key).value_or(into);
}
void take(const toml_table& from, std::string_view key, std::string& into) {
    into = from.text(key).value_or(into);
}
void take(const toml_table& from, std::string_view key, std::optional<utc_time>& into) {
    into = from.utc(key);
}

/// One of a few words.
template <typename Choice, std::size_t Count>
void take(const toml_table& from, std::string_view key, Choice& into,
          const std::array<std::pair<std::string_view, Choice>, Count>& words) {
    const auto text = from.text(key);
    if (!text)
        return;
    std::array<std::string_view, Count> names;
    for (std::size_t k = 0; k < Count; ++k) {
        names[k] = words[k].first;
        if (*text == names[k]) {
            into = words[k].second;
            return;
        }
    }
    throw from.wrong(key, fmt::format("is {}", in_quotes(*text)), name_hint(*text, names));
}

/// Reads every table once and remembers where it stands, so that a complaint finds its line.
class scene_reader {
public:
    explicit scene_reader(toml_table root) : root_{std::move(root)} {}

    scene read() {
        read_recording(root_.need_table("recording"));
        for (const placed& each : numbered("", root_, "segment"))
            read_segment(each.table);
        for (const placed& each : numbered("", root_, "carrier"))
            read_carrier(each.table, each.path);
        if (const auto path = named("", root_, "path"))
            read_path(*path);
        if (const auto receiver = named("", root_, "receiver"))
            read_receiver(*receiver);
        root_.finish();
        check_scene(made_,
                    [&](const std::string& table, std::string_view key, std::string_view what,
                        std::string_view mend) { return complaint(table, key, what, mend); });
        return std::move(made_);
    }

private:
    struct placed {
        toml_table table;
        std::string path;
    };

    std::vector<placed> numbered(const std::string& path, const toml_table& from,
                                 std::string_view name) {
        std::vector<placed> found;
        for (const toml_table& table : from.tables(name)) {
            found.push_back({table, fmt::format("{}{}{}[{}]", path, path.empty() ? "" : ".", name,
                                                found.size())});
            places_.insert_or_assign(found.back().path, table);
        }
        return found;
    }

    std::optional<toml_table> named(const std::string& path, const toml_table& from,
                                    std::string_view name) {
        auto found = from.table(name);
        if (found)
            places_.insert_or_assign(fmt::format("{}{}{}", path, path.empty() ? "" : ".", name),
                                     *found);
        return found;
    }

    std::vector<scene_point> points(const std::string& path, const toml_table& from,
                                    std::string_view name, std::string_view value_key,
                                    std::string_view example) {
        std::vector<scene_point> found;
        for (const placed& each : numbered(path, from, name))
            found.push_back({each.table.need_number("time_s", "0.0"),
                             each.table.need_number(value_key, example)});
        return found;
    }

    /// The nearest enclosing table that the file holds.
    error complaint(std::string table, std::string_view key, std::string_view what,
                    std::string_view mend) const {
        while (!table.empty()) {
            const auto place = places_.find(table);
            if (place != places_.end())
                return place->second.wrong(key, what, mend);
            const std::size_t dot = table.rfind('.');
            table.resize(dot == std::string::npos ? 0 : dot);
        }
        return root_.need_table("recording").wrong(key, what, mend);
    }

    void read_length(const toml_table& from, double& duration_s, sample_index& samples) {
        if (from.has("samples") && from.has("duration_s"))
            throw from.wrong("samples", "stands beside duration_s", "keep one of them");
        take(from, "duration_s", duration_s);
        take(from, "samples", samples);
    }

    void read_recording(const toml_table& from) {
        if (const auto format = from.text("format")) {
            const auto parsed = parse_sample_format(*format);
            if (!parsed)
                throw from.wrong("format", fmt::format("is {}", in_quotes(*format)),
                                 "write one such as ci16_le, cf32_le, cu8 or ri16_le");
            made_.format = *parsed;
        }
        made_.rate_hz = from.need_number("rate_hz", "48000");
        take(from, "centre_hz", made_.centre_hz);
        take(from, "start_utc", made_.start_utc);
        read_length(from, made_.duration_s, made_.samples);
        take(from, "truth_every_s", made_.truth_every_s);
        take(from, "description", made_.description);
        const std::int64_t seed = from.whole("seed").value_or(1);
        if (seed < 0)
            throw from.wrong("seed", "is negative", "give a whole number from 0 on");
        made_.seed = static_cast<std::uint64_t>(seed);
    }

    void read_segment(const toml_table& from) {
        scene_segment& segment = made_.segments.emplace_back();
        read_length(from, segment.duration_s, segment.samples);
        take(from, "lost_s", segment.lost_s);
        take(from, "centre_hz", segment.centre_hz);
        take(from, "start_utc", segment.start_utc);
    }

    void read_carrier(const toml_table& from, const std::string& path) {
        scene_carrier& carrier = made_.carriers.emplace_back();
        take(from, "offset_hz", carrier.offset_hz);
        take(from, "follows_centre", carrier.follows_centre);
        take(from, "level_dbfs", carrier.level_dbfs);
        take(from, "phase_deg", carrier.phase_deg);
        take(from, "drift_hz_s", carrier.drift_hz_s);
        take(from, "wobble_hz", carrier.wobble_hz);
        take(from, "wobble_period_s", carrier.wobble_period_s);
        take(from, "phase_noise_dbc_hz", carrier.phase_noise_dbc_hz);
        take(from, "phase_noise_offset_hz", carrier.phase_noise_offset_hz);
        take(from, "start_s", carrier.start_s);
        take(from, "stop_s", carrier.stop_s);
        take(from, "speech_percent", carrier.speech_percent);
        constexpr std::array<std::pair<std::string_view, overmodulation>, 2> ways{
            {{"fold", overmodulation::fold}, {"pinch-off", overmodulation::pinch_off}}};
        take(from, "overmodulation", carrier.overmodulation, ways);
        for (const placed& each : numbered(path, from, "tone"))
            carrier.tones.push_back(tone(each));
        for (const placed& each : numbered(path, from, "hum"))
            carrier.hum.push_back(hum(each.table));
        for (const placed& each : numbered(path, from, "wave"))
            carrier.waves.push_back(wave(each.table));
        carrier.fades = points(path, from, "fade", "level_db", "-20.0");
        if (const auto field = named(path, from, "polarization"))
            carrier.polarization = polarization(*field);
        if (const auto lobe = named(path, from, "pattern"))
            carrier.pattern = pattern(*lobe);
    }

    scene_tone tone(const placed& from) {
        scene_tone read;
        take(from.table, "frequency_hz", read.frequency_hz);
        take(from.table, "depth_percent", read.depth_percent);
        take(from.table, "phase_deg", read.phase_deg);
        take(from.table, "start_s", read.start_s);
        take(from.table, "stop_s", read.stop_s);
        take(from.table, "incidental_rad", read.incidental_rad);
        take(from.table, "incidental_phase_deg", read.incidental_phase_deg);
        for (const placed& each : numbered(from.path, from.table, "harmonic")) {
            scene_harmonic& harmonic = read.harmonics.emplace_back();
            sample_index order = harmonic.order;
            take(each.table, "order", order);
            if (order < 2 || order > 1000)
                throw each.table.wrong("order", fmt::format("is {}", order), "give 2 to 1000");
            harmonic.order = static_cast<unsigned>(order);
            take(each.table, "percent", harmonic.percent);
            take(each.table, "phase_deg", harmonic.phase_deg);
        }
        return read;
    }

    static scene_hum hum(const toml_table& from) {
        scene_hum read;
        take(from, "frequency_hz", read.frequency_hz);
        take(from, "depth_percent", read.depth_percent);
        take(from, "phase_deg", read.phase_deg);
        return read;
    }

    static scene_wave wave(const toml_table& from) {
        scene_wave read;
        take(from, "amplitude", read.amplitude);
        take(from, "phase_deg", read.phase_deg);
        take(from, "direction_deg", read.direction_deg);
        take(from, "delay_s", read.delay_s);
        return read;
    }

    static scene_polarization polarization(const toml_table& from) {
        scene_polarization read;
        take(from, "axial_ratio_db", read.axial_ratio_db);
        take(from, "tilt_deg", read.tilt_deg);
        take(from, "isolation_db", read.isolation_db);
        take(from, "isolation_phase_deg", read.isolation_phase_deg);
        return read;
    }

    static scene_pattern pattern(const toml_table& from) {
        scene_pattern read;
        constexpr std::array<std::pair<std::string_view, scene_pattern::shape>, 2> shapes{
            {{"half-wave", scene_pattern::shape::half_wave},
             {"cardioid", scene_pattern::shape::cardioid}}};
        take(from, "kind", read.kind, shapes);
        take(from, "bearing_deg", read.bearing_deg);
        take(from, "front_to_back_db", read.front_to_back_db);
        return read;
    }

    void read_path(const toml_table& from) {
        scene_path& path = made_.path;
        take(from, "speed_m_s", path.speed_m_s);
        take(from, "begin_m", path.begin_m);
        path.points = points("path", from, "point", "position_m", "0.0");
        take(from, "rotation_deg_s", path.rotation_deg_s);
        take(from, "begin_deg", path.begin_deg);
        path.angles = points("path", from, "angle", "angle_deg", "0.0");
        const auto resonator = named("path", from, "resonator");
        if (!resonator)
            return;
        scene_resonator& poles = path.resonator.emplace();
        take(*resonator, "leak", poles.leak);
        take(*resonator, "leak_phase_deg", poles.leak_phase_deg);
        for (const placed& each : numbered("path.resonator", *resonator, "mode")) {
            scene_mode& mode = poles.modes.emplace_back();
            mode.frequency_hz = each.table.need_number("frequency_hz", "145.2e6");
            take(each.table, "q_loaded", mode.q_loaded);
            take(each.table, "amplitude", mode.amplitude);
            take(each.table, "phase_deg", mode.phase_deg);
        }
    }

    void read_receiver(const toml_table& from) {
        scene_receiver& receiver = made_.receiver;
        take(from, "noise_dbfs_hz", receiver.noise_dbfs_hz);
        take(from, "compression_dbfs", receiver.compression_dbfs);
        take(from, "iq_gain_error_db", receiver.iq_gain_error_db);
        take(from, "iq_phase_error_deg", receiver.iq_phase_error_deg);
        take(from, "dc_dbfs", receiver.dc_dbfs);
        take(from, "dc_phase_deg", receiver.dc_phase_deg);
        take(from, "clip_dbfs", receiver.clip_dbfs);
        take(from, "noise_lsb_rms", receiver.noise_lsb_rms);
        for (const scene_point& step : points("receiver", from, "gain_step", "gain_db", "-10.0"))
            receiver.gain_steps.push_back({step.time_s, step.value});
        if (const auto control = named("receiver", from, "gain_control"))
            receiver.gain_control = gain_control(*control);
        for (const placed& each : numbered("receiver", from, "spur"))
            receiver.spurs.push_back(spur(each.table));
        for (const placed& each : numbered("receiver", from, "gap")) {
            scene_gap& gap = receiver.gaps.emplace_back();
            gap.start_s = each.table.need_number("start_s", "1.0");
            read_length(each.table, gap.duration_s, gap.samples);
        }
        for (const placed& each : numbered("receiver", from, "non_finite"))
            receiver.non_finite.push_back(non_finite(each.table));
    }

    static scene_gain_control gain_control(const toml_table& from) {
        scene_gain_control read;
        take(from, "target_dbfs", read.target_dbfs);
        take(from, "attack_s", read.attack_s);
        take(from, "release_s", read.release_s);
        take(from, "least_db", read.least_db);
        take(from, "most_db", read.most_db);
        take(from, "begin_db", read.begin_db);
        return read;
    }

    static scene_spur spur(const toml_table& from) {
        scene_spur read;
        take(from, "offset_hz", read.offset_hz);
        take(from, "level_dbfs", read.level_dbfs);
        take(from, "phase_deg", read.phase_deg);
        return read;
    }

    static scene_non_finite non_finite(const toml_table& from) {
        scene_non_finite read;
        take(from, "first", read.first);
        take(from, "count", read.count);
        constexpr std::array<std::pair<std::string_view, scene_non_finite::kind>, 3> kinds{
            {{"nan", scene_non_finite::kind::nan},
             {"inf", scene_non_finite::kind::infinity},
             {"-inf", scene_non_finite::kind::minus_infinity}}};
        take(from, "value", read.value, kinds);
        return read;
    }

    toml_table root_;
    scene made_;
    std::map<std::string, toml_table> places_;
};

} // namespace

scene read_scene(const std::filesystem::path& file) {
    return scene_reader{read_toml(file)}.read();
}

scene parse_scene(std::string_view toml, const std::string& name) {
    return scene_reader{parse_toml(toml, name)}.read();
}

} // namespace tonewalk
