// SPDX-License-Identifier: GPL-3.0-or-later
// Names of channels, conditions, participants: values are joined by label, never by position.
#pragma once
#include <Eigen/Core>

#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace headwater {

using Labels = std::vector<std::string>;

/// ASCII lower case; electrode names are compared in this form.
std::string fold_case(std::string_view text);

/// Position of `name` in `labels`, exact spelling.
std::optional<Eigen::Index> find_label(const Labels& labels, std::string_view name);

/// Position of `name` in `labels`, upper and lower case alike.
std::optional<Eigen::Index> find_label_any_case(const Labels& labels, std::string_view name);

/// For each of `wanted` (exact spelling) its position in `available`. Throws InputError that lists
/// every missing label; `where` names the thing searched, e.g. a file.
std::vector<Eigen::Index> match_labels(const Labels& wanted, const Labels& available,
                                       const std::string& where);

/// Labels that occur more than once (upper and lower case alike), each listed once.
Labels repeated_labels(const Labels& labels);

/// The candidate nearest to `name` by edit distance (case ignored) when near enough to be a slip of
/// the keyboard, else empty.
std::string nearest_label(std::string_view name, const Labels& candidates);

/// " Did you mean 'x'?" or an empty string.
std::string did_you_mean(std::string_view name, const Labels& candidates);

/// Letters and digits only, words joined with capitals: "late minus steady" -> "lateMinusSteady".
/// The label part of file names, in the BIDS manner.
std::string file_label(std::string_view text);

/// "a, b and c".
std::string join_labels(const Labels& labels);

}  // namespace headwater
