// SPDX-License-Identifier: GPL-3.0-or-later
#include "truth_json.hpp"

#include <cmath>
#include <vector>

#include "exact.hpp"
#include "json_writer.hpp"
#include "propagation.hpp"
#include "receiver.hpp"
#include "timing.hpp"
#include "tonewalk/base/estimate.hpp"
#include "tonewalk/scene/truth.hpp"
#include "tuning.hpp"
#include "waveform_truth.hpp"

namespace tonewalk {
namespace {

double db_or_null(double amplitude) noexcept {
    return amplitude > 0.0 ? db_from_amplitude(amplitude) : not_measured;
}

class truth_document {
public:
    truth_document(const scene& whole, std::span<const double> controlled_gain_db,
                   const std::function<void(std::string_view)>& write)
        : whole_{whole}, stretches_{scene_layout(whole)}, truth_{whole},
          controlled_gain_db_{controlled_gain_db}, write_{write} {}

    void write(std::string_view sha512) {
        json_.begin_object();
        json_.begin_object("tonewalk").whole("schema", 1).end();
        json_.text("job", "make").text("description", whole_.description);
        put_recording(sha512);
        json_.begin_object("result");
        put_receiver();
        put_path();
        json_.begin_array("carriers");
        for (std::size_t k = 0; k < whole_.carriers.size(); ++k)
            put_carrier(k);
        json_.end().end().end();
        write_(json_.take());
    }

private:
    [[nodiscard]] double point_s(std::size_t k) const noexcept {
        return static_cast<double>(k) * whole_.truth_every_s;
    }
    [[nodiscard]] double controlled_gain(std::size_t k) const noexcept {
        return controlled_gain_db_.empty() ? 0.0 : controlled_gain_db_[k];
    }

    template <typename Value>
    void put_series(std::string_view key, const Value& value) {
        json_.begin_array(key);
        for (std::size_t k = 0; k < truth_points(whole_); ++k) {
            json_.element(value(k));
            if (json_.pending() > 65536)
                write_(json_.take());
        }
        json_.end();
    }

    void put_recording(std::string_view sha512) {
        const sample_index samples = stored_samples(whole_);
        json_.begin_object("recording");
        json_.text("format", whole_.format.name()).number("sample_rate_hz", whole_.rate_hz);
        json_.number("centre_hz", whole_.centre_hz);
        if (whole_.start_utc)
            json_.text("start_utc", format_utc(*whole_.start_utc, 9));
        else
            json_.null("start_utc");
        json_.whole("samples", samples);
        json_.number("duration_s", static_cast<double>(samples) / whole_.rate_hz);
        json_.number("span_s", scene_span_s(whole_)).text("sha512", sha512).end();
    }

    void put_receiver() {
        const scene_receiver& receiver = whole_.receiver;
        json_.number("noise_density_dbfs_hz", receiver.noise_dbfs_hz);
        json_.number("dc_dbfs", receiver.dc_dbfs);
        json_.number("iq_gain_error_db", receiver.iq_gain_error_db);
        json_.number("iq_phase_error_deg", receiver.iq_phase_error_deg);
        json_.begin_array("segments");
        for (const scene_stretch& each : stretches_) {
            json_.begin_object().whole("first_sample", each.first);
            json_.whole("position", each.position).whole("samples", each.count);
            json_.number("centre_hz", each.centre_hz).end();
        }
        json_.end().begin_array("gaps");
        for (std::size_t k = 1; k < stretches_.size(); ++k) {
            const sample_index end = stretches_[k - 1].position + stretches_[k - 1].count;
            const sample_index lost = stretches_[k].position - end;
            if (lost > 0)
                json_.begin_object()
                    .number("time_s", static_cast<double>(end) / whole_.rate_hz)
                    .whole("samples", lost)
                    .end();
        }
        json_.end().begin_object("gain_control");
        json_.yes_no("suspected", receiver.gain_control.has_value()).end();
        if (!receiver.gain_steps.empty() || receiver.gain_control)
            put_series("receiver_gain_db", [&](std::size_t k) {
                return stepped_gain_db(receiver, point_s(k)) + controlled_gain(k);
            });
    }

    void put_path() {
        scene_motion position = position_motion(whole_.path), angle = angle_motion(whole_.path);
        put_series("time_s", [&](std::size_t k) { return point_s(k); });
        if (position.moves())
            put_series("position_m", [&](std::size_t k) { return position.at(point_s(k)); });
        if (angle.moves())
            put_series("angle_deg", [&](std::size_t k) { return angle.at(point_s(k)); });
    }

    void put_carrier(std::size_t carrier) {
        const scene_carrier& described = whole_.carriers[carrier];
        const carrier_truth at_start = truth_.at(carrier, std::fmax(0.0, described.start_s));
        json_.begin_object();
        json_.number("carrier_offset_hz", at_start.on ? at_start.offset_hz : not_measured);
        json_.number("carrier_hz", at_start.on && whole_.centre_hz
                                       ? *whole_.centre_hz + described.offset_hz
                                       : not_measured);
        json_.number("carrier_dbfs", db_or_null(at_start.line_amplitude));
        put_depth(described);
        put_log(carrier);
        json_.begin_array("extrema");
        scene_motion position = position_motion(whole_.path), angle = angle_motion(whole_.path);
        for (const scene_truth::extremum& each : truth_.extrema(carrier)) {
            json_.begin_object().text("kind", each.is_peak ? "peak" : "null");
            json_.number("time_s", each.time_s).number("level_dbfs", each.level_dbfs);
            if (position.moves())
                json_.number("position_m", position.at(each.time_s));
            if (angle.moves())
                json_.number("angle_deg", angle.at(each.time_s));
            json_.end();
        }
        json_.end().end();
    }

    void put_depth(const scene_carrier& described) {
        double sum = 0.0, squares = 0.0;
        json_.begin_array("tones");
        for (const scene_tone& tone : described.tones) {
            double harmonic_squares = 0.0;
            for (const scene_harmonic& each : tone.harmonics)
                harmonic_squares += each.percent * each.percent;
            sum += tone.depth_percent;
            squares += tone.depth_percent * tone.depth_percent;
            json_.begin_object().number("frequency_hz", tone.frequency_hz);
            json_.number("depth_percent", tone.depth_percent);
            json_.number("phase_deg", tone.phase_deg);
            json_.number("thd_percent", std::sqrt(harmonic_squares));
            json_.number("incidental_rad", tone.incidental_rad).end();
        }
        json_.end().number("sum_of_depths_percent", sum);
        json_.number("rms_depth_percent", std::sqrt(squares));
        json_.yes_no("overmodulated", overmodulated(described));
    }

    /// tone_dbfs: of the first tone, as levels reports one.
    void put_log(std::size_t carrier) {
        std::vector<double> carrier_db, tone_db, offset_hz;
        for (std::size_t k = 0; k < truth_points(whole_); ++k) {
            const carrier_truth now = truth_.at(carrier, point_s(k));
            carrier_db.push_back(db_or_null(now.line_amplitude) + controlled_gain(k));
            tone_db.push_back(now.tone_amplitudes.empty()
                                  ? not_measured
                                  : db_or_null(now.tone_amplitudes.front()) + controlled_gain(k));
            offset_hz.push_back(now.on ? now.offset_hz : not_measured);
        }
        json_.number("interval_s", whole_.truth_every_s).begin_object("log");
        put_series("time_s", [&](std::size_t k) { return point_s(k); });
        put_series("carrier_dbfs", [&](std::size_t k) { return carrier_db[k]; });
        put_series("tone_dbfs", [&](std::size_t k) { return tone_db[k]; });
        put_series("carrier_offset_hz", [&](std::size_t k) { return offset_hz[k]; });
        json_.end();
    }

    const scene& whole_;
    std::vector<scene_stretch> stretches_;
    scene_truth truth_;
    std::span<const double> controlled_gain_db_;
    const std::function<void(std::string_view)>& write_;
    json_writer json_;
};

} // namespace

std::size_t truth_points(const scene& whole) {
    return static_cast<std::size_t>(scene_span_s(whole) / whole.truth_every_s) + 1;
}

void write_truth(const scene& whole, std::string_view sha512,
                 std::span<const double> controlled_gain_db,
                 const std::function<void(std::string_view)>& write) {
    truth_document{whole, controlled_gain_db, write}.write(sha512);
}

} // namespace tonewalk
