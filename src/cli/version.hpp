// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

namespace tonewalk::cli {

/// The version on standard output; with `licences` also every library inside, with its licence.
void print_version(bool licences);

} // namespace tonewalk::cli
