// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/recording_survey.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "carrier_tracks.hpp"
#include "image_fit.hpp"
#include "search_survey.hpp"
#include "signal_choice.hpp"
#include "spectrum_curve.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr double probing_from_s = 2.0; // shorter files are looked at whole

/// The stretches of a recording that are looked at, one in memory at a time.
class survey_looks {
public:
    explicit survey_looks(block_source& source)
        : source_{source}, converter_{source.facts()}, probes_{source.facts().seekable &&
                                                                       source.facts().duration_s() >
                                                                           probing_from_s
                                                                   ? probes_in(source.facts())
                                                                   : 0} {}
    [[nodiscard]] std::size_t size() const noexcept { return std::max<std::size_t>(1, probes_); }
    [[nodiscard]] opening operator[](std::size_t k) const {
        return probes_ == 0 ? look_at_opening(source_, converter_)
                            : look_at_probe(source_, converter_, k, probes_);
    }

private:
    block_source& source_;
    sample_converter converter_;
    std::size_t probes_;
};

/// What all looks together show.
class survey_sums {
public:
    void add(searched s) {
        densities_.push_back(s.spectrum.floor_density());
        images_.add(s.look.what, s.spectrum);
        if (!mean_) {
            mean_ = std::move(s.spectrum);
            centre_shift_hz_ = s.look.what.centre_shift_hz;
        } else if (mean_->size() == s.spectrum.size() &&
                   centre_shift_hz_ == s.look.what.centre_shift_hz) {
            mean_->merge(s.spectrum);
        }
    }
    void tell(recording_survey& r, const stream_facts& facts) const {
        const double density = median(densities_);
        r.noise_density_dbfs_hz =
            density > 0.0 ? decibel::from_power_ratio(density).db() : not_measured;
        r.balance = images_.result();
        r.spectrum = spectrum_curve(*mean_, facts, centre_shift_hz_);
    }

private:
    std::vector<double> densities_;
    image_fit images_;
    std::optional<line_spectrum> mean_; // of the looks at the first one's centre
    double centre_shift_hz_ = 0.0;
};

using tracks = std::vector<carrier_tracks::track>;

/// The look where the carrier that the user named showed best.
std::size_t look_at_given(const tracks& found, double given_hz) {
    const auto away = [given_hz](const carrier_tracks::track& t) {
        return std::abs(t.carrier.offset_hz - given_hz);
    };
    const auto nearest =
        std::min_element(found.begin(), found.end(),
                         [&](const auto& a, const auto& b) { return away(a) < away(b); });
    return nearest == found.end() ? 0 : nearest->look;
}

/// What a measuring job would take, from the look where that carrier showed best. Nothing where the
/// band ends before the carrier's tone.
std::optional<found_signal> take_best(const recording_survey& r, const survey_looks& looks,
                                      const tracks& found, const search_request& request,
                                      std::optional<double> given_hz) {
    if (given_hz) {
        const searched s{looks[look_at_given(found, *given_hz)]};
        const found_carrier given = take_given(s.look.what, *given_hz, request);
        return take_signal(s, {given}, given, request);
    }
    if (r.carriers.empty()) {
        return std::nullopt;
    }
    const found_carrier& chosen = choose(r.carriers);
    const auto place = static_cast<std::size_t>(&chosen - r.carriers.data());
    const bool fits = request.width_hz || !std::isnan(chosen.width_hz);
    return fits ? std::optional{take_signal(searched{looks[found[place].look]}, r.carriers, chosen,
                                            request)}
                : std::nullopt;
}

/// What finds the carrier again: its offset to the hertz, or, outside the band about the
/// recording's own centre, its frequency.
std::string carrier_option(const found_carrier& c, const stream_facts& facts) {
    const bool in_band = std::abs(c.offset_hz) < facts.sample_rate_hz / 2.0;
    const double whole_hz = std::round(c.offset_hz) + 0.0; // no -0
    return fmt::format("--carrier {}",
                       in_band
                           ? format_option_hz(whole_hz, true)
                           : format_option_hz(std::round(*facts.centre_hz + c.offset_hz), false));
}

sheet describe(const found_carrier& c, const stream_facts& facts) {
    const double width_db = decibel::from_power_ratio(c.width_hz).db();
    sheet page;
    page.add("offset_hz", "Hz", cell{c.offset_hz});
    page.add("frequency_hz", "Hz", facts.centre_hz ? cell{*facts.centre_hz + c.offset_hz} : cell{});
    page.add("level_dbfs", "dBFS", cell{c.level_dbfs});
    page.add("snr_db", "dB", cell{c.carrier_to_noise_density_dbhz - width_db});
    page.add("carrier_to_noise_density_dbhz", "dBHz", cell{c.carrier_to_noise_density_dbhz});
    page.add("carrier_option", "", cell{carrier_option(c, facts)});
    const auto column = [tones = c.tones](double found_tone::*value) {
        return [tones, value](std::size_t row) { return cell{tones[row].*value}; };
    };
    page.add(sheet_table{.key = "tones",
                         .rows = c.tones.size(),
                         .columns = {{"frequency_hz", "Hz", column(&found_tone::frequency_hz)},
                                     {"depth_percent", "%", column(&found_tone::depth_percent)}},
                         .form = table_form::as_records});
    return page;
}

} // namespace

recording_survey survey_recording(block_source& source, const search_request& request,
                                  const std::stop_token& stop) {
    const stream_facts& facts = source.facts();
    const std::optional<double> given_hz = given_carrier(request, facts);
    const survey_looks looks{source};
    recording_survey r;
    survey_sums sums;
    carrier_tracks carriers;
    for (std::size_t k = 0; k == 0 || (k < looks.size() && !stop.stop_requested()); ++k) {
        opening look = looks[k];
        if (look.what.frames < least_frames_searched && k > 0) {
            continue;
        }
        if (k == 0) {
            r.notes = notes_on(look.what);
        }
        searched s{std::move(look)};
        carriers.add(carriers_in(s), k);
        sums.add(std::move(s));
    }
    const tracks found = carriers.strongest_first();
    for (const carrier_tracks::track& t : found) {
        r.carriers.push_back(t.carrier);
    }
    sums.tell(r, facts);
    r.best = take_best(r, looks, found, request, given_hz);
    if (r.best) {
        r.notes.merge(r.best->notes);
    }
    return r;
}

sheet describe(const recording_survey& r, const stream_facts& facts) {
    sheet page;
    page.add("noise_density_dbfs_hz", "dBFS/Hz", cell{r.noise_density_dbfs_hz});
    page.join(describe(r.balance.value_or(iq_balance{})));
    sheet_group carriers{.key = "carriers", .parts = {}, .list = true};
    for (const found_carrier& c : r.carriers) {
        carriers.parts.push_back(describe(c, facts));
    }
    page.items.emplace_back(std::move(carriers));
    page.add(r.spectrum);
    return page;
}

} // namespace tonewalk
