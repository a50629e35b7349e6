// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/convert.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>

#include "stored.hpp"

namespace tonewalk {
namespace {

// Samples handled at once, all in cache. Shorter runs are filled up with zeros, which no sum and no
// rail counts, so that every loop below has a length that the compiler knows.
constexpr std::size_t chunk = 128;
constexpr std::size_t sum_lanes = 8;

// Where the components of sample n lie: base + n * stride + offset.
struct layout {
    std::size_t stride = 0, i_offset = 0, q_offset = 0;
    bool is_complex = true, reversed = false;
};

template <class Value>
struct chunk_values {
    alignas(64) std::array<Value, 2 * chunk> both; // I of all samples, then Q
    Value* i() noexcept { return both.data(); }
    Value* q() noexcept { return both.data() + chunk; }
};

template <class Stored>
using value_of = decltype(centred(Stored{}));

// Products of 32-bit integers need 126 bits in the sum, those of shorter ones fit for 2^33 samples.
__extension__ using wide_integer = __int128;
template <class Stored>
using sum_of =
    std::conditional_t<std::is_floating_point_v<Stored>, double,
                       std::conditional_t<sizeof(Stored) == 4, wide_integer, std::int64_t>>;

template <class Stored>
constexpr double full_scale() noexcept {
    if constexpr (std::is_floating_point_v<Stored>)
        return 1.0;
    else
        return static_cast<double>(std::uint64_t{1} << (8 * sizeof(Stored) - 1));
}

template <class Stored>
void read_chunk(const std::byte* frames, const layout& where, std::size_t count,
                chunk_values<value_of<Stored>>& values) noexcept {
    auto* const i = values.i();
    auto* const q = values.q();
    for (std::size_t n = 0; n < count; ++n) {
        const std::byte* const frame = frames + n * where.stride;
        i[n] = centred(load<Stored>(frame + where.i_offset, where.reversed));
    }
    for (std::size_t n = 0; where.is_complex && n < count; ++n) {
        const std::byte* const frame = frames + n * where.stride;
        q[n] = centred(load<Stored>(frame + where.q_offset, where.reversed));
    }
    std::fill(i + count, i + chunk, value_of<Stored>{0});
    std::fill(q + (where.is_complex ? count : 0), q + chunk, value_of<Stored>{0});
}

// The common case, one lane of complex samples in this machine's byte order, in a loop that
// vectorises.
template <class Stored>
void read_plain_chunk(const std::byte* frames, chunk_values<value_of<Stored>>& values) noexcept {
    std::array<Stored, 2 * chunk> stored;
    std::memcpy(stored.data(), frames, sizeof stored);
    for (std::size_t n = 0; n < chunk; ++n) {
        values.i()[n] = centred(stored[2 * n]);
        values.q()[n] = centred(stored[2 * n + 1]);
    }
}

// One range a cell, from the first such sample in it to the last.
void note_non_finite(raw_counts& counts, sample_index index, sample_index cell_first) {
    ++counts.zeroed;
    std::vector<sample_range>& ranges = counts.non_finite;
    if (ranges.empty() || ranges.back().first < cell_first)
        ranges.push_back({index, 1});
    else
        ranges.back().count = index + 1 - ranges.back().first;
}

// Zeroes samples that single precision cannot hold, and says where they were.
template <class Value>
void drop_non_finite(chunk_values<Value>& values, sample_index first, sample_index cell_first,
                     raw_counts* counts) {
    if constexpr (std::is_floating_point_v<Value>) {
        float poison = 0.0F;
        for (const Value value : values.both)
            poison += static_cast<float>(value) * 0.0F;
        if (poison == 0.0F)
            return;
        for (std::size_t n = 0; n < chunk; ++n) {
            if (std::isfinite(static_cast<float>(values.i()[n])) &&
                std::isfinite(static_cast<float>(values.q()[n])))
                continue;
            values.i()[n] = values.q()[n] = Value{0};
            if (counts)
                note_non_finite(*counts, first + static_cast<sample_index>(n), cell_first);
        }
    }
}

template <class Value>
std::int32_t code_of(Value value, unsigned shift) noexcept {
    if constexpr (std::is_floating_point_v<Value>) {
        const auto single = static_cast<float>(value);
        const auto code =
            static_cast<std::int32_t>(std::bit_cast<std::uint32_t>(std::abs(single)) >> 8);
        return single < 0.0F ? -code : code;
    } else {
        return value >> shift;
    }
}

// The rail of the given sign: from the outermost code of the chunk inwards, as far as the tally
// keeps any.
template <int Sign>
void tally_rail(const std::array<std::int32_t, 2 * chunk>& codes, rail_tally& rail) noexcept {
    const auto magnitude = [](std::int32_t code) { return std::int64_t{Sign} * code; };
    std::int32_t wanted = 0;
    for (const std::int32_t code : codes)
        wanted = Sign > 0 ? std::max(wanted, code) : std::min(wanted, code);
    while (wanted != 0 && magnitude(wanted) >= rail.codes.back()) {
        std::uint32_t found = 0;
        std::int32_t next = 0;
        for (const std::int32_t code : codes) {
            const bool inside = Sign > 0 ? code < wanted : code > wanted;
            found += code == wanted ? 1U : 0U;
            next = Sign > 0 ? std::max(next, inside ? code : 0) : std::min(next, inside ? code : 0);
        }
        rail.add(magnitude(wanted), found);
        wanted = next;
    }
}

template <class Value>
void tally_chunk(const chunk_values<Value>& values, unsigned shift, raw_counts& counts) noexcept {
    std::array<std::int32_t, 2 * chunk> codes;
    for (std::size_t n = 0; n < codes.size(); ++n)
        codes[n] = code_of(values.both[n], shift);
    tally_rail<+1>(codes, counts.positive);
    tally_rail<-1>(codes, counts.negative);
}

// Sums over one cell, each in fixed lanes that are added in a fixed order.
template <class Stored>
class cell_adder {
public:
    void add(chunk_values<value_of<Stored>>& values) noexcept {
        for (std::size_t n = 0; n < chunk; n += sum_lanes)
            for (std::size_t lane = 0; lane < sum_lanes; ++lane)
                add(lane, static_cast<product>(values.i()[n + lane]),
                    static_cast<product>(values.q()[n + lane]));
    }

    cell_sums result(bool inverted) const noexcept {
        constexpr double unit = 1.0 / full_scale<Stored>();
        const double mirror = inverted ? -1.0 : 1.0;
        cell_sums sums;
        sums.i = total(i_) * unit;
        sums.q = total(q_) * unit * mirror;
        sums.ii = total(ii_) * unit * unit;
        sums.qq = total(qq_) * unit * unit;
        sums.iq = total(iq_) * unit * unit * mirror;
        sums.peak_power = highest(power_) * unit * unit;
        sums.peak_component = highest(component_) * unit;
        return sums;
    }

private:
    using sum = sum_of<Stored>;
    using product =
        std::conditional_t<std::is_floating_point_v<Stored>, double,
                           std::conditional_t<sizeof(Stored) == 4, std::int64_t, std::int32_t>>;
    // |z|^2 of integers reaches 2^63 or 2^31: one more than the signed type holds.
    template <class Product>
    static auto unsigned_or_real(Product value) noexcept {
        if constexpr (std::is_floating_point_v<Product>)
            return value;
        else
            return static_cast<std::make_unsigned_t<Product>>(value);
    }
    using magnitude = decltype(unsigned_or_real(product{}));
    template <class Item>
    using lanes = std::array<Item, sum_lanes>;

    void add(std::size_t lane, product i, product q) noexcept {
        const product ii = i * i, qq = q * q;
        i_[lane] += i;
        q_[lane] += q;
        ii_[lane] += ii;
        qq_[lane] += qq;
        iq_[lane] += i * q;
        const magnitude power = unsigned_or_real(ii) + unsigned_or_real(qq);
        power_[lane] = power > power_[lane] ? power : power_[lane];
        const magnitude larger =
            std::max(unsigned_or_real(i < 0 ? -i : i), unsigned_or_real(q < 0 ? -q : q));
        component_[lane] = larger > component_[lane] ? larger : component_[lane];
    }
    static double total(const lanes<sum>& parts) noexcept {
        sum whole = 0;
        for (const sum part : parts)
            whole += part;
        return static_cast<double>(whole);
    }
    static double highest(const lanes<magnitude>& parts) noexcept {
        return static_cast<double>(*std::max_element(parts.begin(), parts.end()));
    }

    lanes<sum> i_{}, q_{}, ii_{}, qq_{}, iq_{};
    lanes<magnitude> power_{}, component_{};
};

// Scaling by a power of two is exact, whatever the machine.
template <class Value>
void write_chunk(chunk_values<Value>& values, float scale, bool inverted,
                 std::span<cf32> out) noexcept {
    const float q_scale = inverted ? -scale : scale;
    for (std::size_t n = 0; n < out.size(); ++n)
        out[n] = {static_cast<float>(values.i()[n]) * scale,
                  static_cast<float>(values.q()[n]) * q_scale};
}

/// z - k conj(z) over 1 - |k|^2, as what I and Q give to I and Q.
class image_remover {
public:
    explicit image_remover(cf64 ratio) noexcept
        : wanted_{ratio != cf64{}}, i_to_i_{single(1.0 - ratio.real(), ratio)},
          crossed_{single(-ratio.imag(), ratio)}, q_to_q_{single(1.0 + ratio.real(), ratio)} {}
    void run(std::span<cf32> samples) const noexcept {
        if (!wanted_)
            return;
        for (cf32& z : samples)
            z = {i_to_i_ * z.real() + crossed_ * z.imag(),
                 crossed_ * z.real() + q_to_q_ * z.imag()};
    }

private:
    static float single(double part, cf64 ratio) noexcept {
        return static_cast<float>(part / (1.0 - std::norm(ratio)));
    }
    bool wanted_;
    float i_to_i_, crossed_, q_to_q_;
};

struct conversion {
    layout where;
    unsigned code_shift = 0;
    bool inverted = false;
    image_remover image;
};

// One cell, or all there is when nothing is counted.
template <class Stored>
void convert_cell(const conversion& how, const std::byte* frames, std::span<cf32> out,
                  sample_index first, raw_counts* counts) noexcept {
    const bool plain = how.where.is_complex && !how.where.reversed &&
                       how.where.stride == 2 * sizeof(Stored) && how.where.i_offset == 0;
    const double scale = (how.where.is_complex ? 1.0 : 2.0) / full_scale<Stored>();
    chunk_values<value_of<Stored>> values;
    cell_adder<Stored> adder;
    for (std::size_t done = 0; done < out.size(); done += chunk) {
        const std::size_t count = std::min(chunk, out.size() - done);
        const std::byte* const from = frames + done * how.where.stride;
        if (plain && count == chunk)
            read_plain_chunk<Stored>(from, values);
        else
            read_chunk<Stored>(from, how.where, count, values);
        drop_non_finite(values, first + static_cast<sample_index>(done), first, counts);
        write_chunk(values, static_cast<float>(scale), how.inverted, out.subspan(done, count));
        how.image.run(out.subspan(done, count));
        if (!counts)
            continue;
        adder.add(values);
        tally_chunk(values, how.code_shift, *counts);
    }
    if (counts)
        counts->cells.push_back(adder.result(how.inverted));
}

} // namespace

void rail_tally::add(std::int64_t code, std::uint64_t count) noexcept {
    std::size_t place = 0;
    while (place < codes.size() && codes[place] > code)
        ++place;
    if (place == codes.size())
        return;
    if (codes[place] != code) {
        const auto first = static_cast<std::ptrdiff_t>(place);
        std::move_backward(codes.begin() + first, codes.end() - 1, codes.end());
        std::move_backward(counts.begin() + first, counts.end() - 1, counts.end());
        codes[place] = code;
        counts[place] = 0;
    }
    counts[place] += count;
}

void rail_tally::merge(const rail_tally& other) noexcept {
    for (std::size_t k = 0; k < other.codes.size() && other.codes[k] > 0; ++k)
        add(other.codes[k], other.counts[k]);
}

void raw_counts::clear() noexcept {
    cells.clear();
    non_finite.clear();
    zeroed = 0;
    positive = negative = {};
}

sample_converter::sample_converter(const stream_facts& facts, cf64 image_ratio)
    : format_{facts.format}, lanes_{facts.lanes}, lane_{facts.lane}, swap_iq_{facts.swap_iq},
      inverted_{facts.inverted}, image_ratio_{image_ratio} {
    assert(lane_ < lanes_);
    assert(std::norm(image_ratio_) < 1.0);
    assert(format_.is_complex || image_ratio_ == cf64{});
    const auto bits = static_cast<unsigned>(8 * format_.component_bytes());
    if (!format_.is_float() && facts.code_bits != 0 && facts.code_bits < bits)
        code_shift_ = bits - facts.code_bits;
}

void sample_converter::convert(std::span<const std::byte> frames,
                               std::span<cf32> out) const noexcept {
    run(frames, out, 0, std::max<std::size_t>(out.size(), 1), nullptr);
}

void sample_converter::convert(std::span<const std::byte> frames, std::span<cf32> out,
                               sample_index first, std::size_t cell,
                               raw_counts& counts) const noexcept {
    assert(cell > 0);
    run(frames, out, first, cell, &counts);
}

void sample_converter::run(std::span<const std::byte> frames, std::span<cf32> out,
                           sample_index first, std::size_t cell,
                           raw_counts* counts) const noexcept {
    const std::size_t sample_bytes = format_.sample_bytes();
    assert(frames.size() >= out.size() * sample_bytes * lanes_);
    const std::size_t lane_offset = lane_ * sample_bytes;
    const std::size_t second = format_.component_bytes();
    const bool swap = swap_iq_ && format_.is_complex;
    const conversion how{
        .where = {.stride = sample_bytes * lanes_,
                  .i_offset = lane_offset + (swap ? second : 0),
                  .q_offset = lane_offset + (swap ? 0 : second),
                  .is_complex = format_.is_complex,
                  .reversed = format_.big_endian != (std::endian::native == std::endian::big)},
        .code_shift = code_shift_,
        .inverted = inverted_,
        .image = image_remover{image_ratio_}};
    with_stored_type(format_.type, [&](auto stored) {
        for (std::size_t done = 0; done < out.size(); done += cell)
            convert_cell<decltype(stored)>(how, frames.data() + done * how.where.stride,
                                           out.subspan(done, std::min(cell, out.size() - done)),
                                           first + static_cast<sample_index>(done), counts);
    });
}

} // namespace tonewalk
