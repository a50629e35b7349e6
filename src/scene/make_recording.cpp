// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/scene/make_recording.hpp"

#include <array>
#include <cmath>
#include <system_error>
#include <utility>
#include <vector>

#include "exact.hpp"
#include "receiver.hpp"
#include "timing.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/output_file.hpp"
#include "tonewalk/recording/sha512.hpp"
#include "tonewalk/recording/sigmf_write.hpp"
#include "tonewalk/scene/generator.hpp"
#include "truth_json.hpp"

namespace tonewalk {
namespace {

namespace fs = std::filesystem;

constexpr std::size_t chunk_samples = 65536;

fs::path with_ending(const fs::path& base, const char* ending) {
    fs::path whole = base;
    const fs::path last = base.extension();
    if (last == ".sigmf-data" || last == ".sigmf-meta")
        whole.replace_extension();
    whole += ending;
    return whole;
}

std::string metadata_text(const scene& whole, const std::string& sha512) {
    sigmf_document document;
    document.format = whole.format;
    document.sample_rate_hz = whole.rate_hz;
    document.description = whole.description;
    document.sha512 = sha512;
    document.segments.clear();
    for (const scene_stretch& each : scene_layout(whole)) {
        sigmf_segment& segment = document.segments.emplace_back();
        segment.sample_start = each.first;
        if (each.position != each.first)
            segment.global_index = each.position;
        segment.centre_hz = each.centre_hz;
        segment.start_utc = each.start_utc;
    }
    return sigmf_text(document);
}

/// What the gain control does at the truth points, collected while samples are made.
class gain_record {
public:
    explicit gain_record(const scene& whole)
        : whole_{whole}, points_{whole.receiver.gain_control ? truth_points(whole) : 0} {}
    [[nodiscard]] bool wanted() const noexcept { return points_ > 0; }
    /// Stored samples are made up to `position`; more than one point may have passed in a gap.
    void reached(sample_index position, double gain_db) {
        while (gains_db_.size() < points_ && next_position() <= position)
            gains_db_.push_back(gain_db);
    }
    [[nodiscard]] sample_index next_position() const noexcept {
        return sample_at(static_cast<double>(gains_db_.size()) * whole_.truth_every_s,
                         whole_.rate_hz);
    }
    std::vector<double> take(double last_gain_db) {
        gains_db_.resize(points_, last_gain_db);
        return std::move(gains_db_);
    }

private:
    const scene& whole_;
    std::size_t points_;
    std::vector<double> gains_db_;
};

struct made_samples {
    std::string sha512;
    std::vector<double> controlled_gain_db;
    bool stopped = false;
};

/// Makes and writes the samples chunk by chunk; chunks end at truth points where the gain is
/// recorded.
made_samples write_samples(const scene& whole, output_file& data, const run_control& control) {
    scene_generator generator{whole};
    gain_record gains{whole};
    sha512_hash hash;
    const sample_index total = stored_samples(whole);
    const std::size_t sample_bytes = whole.format.sample_bytes();
    std::vector<std::byte> bytes(chunk_samples * sample_bytes);
    for (sample_index done = 0; done < total;) {
        if (control.stop.stop_requested())
            return {{}, {}, true};
        std::size_t wanted = chunk_samples;
        if (gains.wanted()) {
            gains.reached(generator.position(), generator.controlled_gain_db());
            const sample_index ahead = gains.next_position() - generator.position();
            wanted = std::min(wanted, static_cast<std::size_t>(std::max<sample_index>(1, ahead)));
        }
        const std::size_t made = generator.render_bytes({bytes.data(), wanted * sample_bytes});
        const std::span<const std::byte> chunk{bytes.data(), made * sample_bytes};
        data.write(chunk);
        hash.add(chunk);
        done += static_cast<sample_index>(made);
        if (control.progress != nullptr)
            control.progress->advance(done, total);
    }
    return {hash.finish(), gains.take(generator.controlled_gain_db()), false};
}

/// All files appear, or none: what a failed commit leaves behind is taken away again.
void commit_all(std::span<output_file* const> files, std::span<const fs::path> targets) {
    std::size_t committed = 0;
    try {
        for (; committed < files.size(); ++committed)
            files[committed]->commit();
    } catch (...) {
        std::error_code ignored; // the first failure is the one to tell
        for (std::size_t k = 0; k < committed; ++k)
            fs::remove(targets[k], ignored);
        throw;
    }
}

} // namespace

made_recording make_recording(const scene& whole, const fs::path& base, bool force,
                              const run_control& control) {
    check_scene(whole, "scene");
    const fs::path name = base.filename();
    if (name.empty() || name == "-" || name == "." || name == "..")
        throw error{fault::bad_request, "is no base name", base.string(),
                    "give one such as walk, which makes walk.sigmf-data and its companions"};
    const std::array<fs::path, 3> targets{with_ending(base, ".sigmf-data"),
                                          with_ending(base, ".sigmf-meta"),
                                          with_ending(base, ".truth.json")};
    output_file data{targets[0], force}, metadata{targets[1], force}, truth{targets[2], force};
    made_recording made{targets[0], targets[1], targets[2], stored_samples(whole), {}, false};
    made_samples samples = write_samples(whole, data, control);
    made.stopped = samples.stopped;
    if (made.stopped)
        return made;
    made.sha512 = std::move(samples.sha512);
    metadata.write(metadata_text(whole, made.sha512));
    write_truth(whole, made.sha512, samples.controlled_gain_db,
                [&](std::string_view text) { truth.write(text); });
    const std::array<output_file*, 3> files{&data, &metadata, &truth};
    commit_all(files, targets);
    return made;
}

} // namespace tonewalk
