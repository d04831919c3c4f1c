// SPDX-License-Identifier: GPL-3.0-or-later
// Over 400 lines: one table, one record for each key.
#include <headwater/app/keys.hpp>

#include <fmt/core.h>

#include <limits>

namespace headwater {
namespace {

constexpr double kAny = std::numeric_limits<double>::infinity();
using T = KeyType;

// NOLINTNEXTLINE(readability-function-size): a table
std::vector<KeyRecord> make_records() {
  return {
      {"title", T::text, "", 0, 0, {}, "\"\"", "Title of the experiment, for pictures and tables."},
      {"output", T::path, "", 0, 0, {}, "\"results\"", "Folder for the results."},
      {"seed", T::whole_number, "", 0, 9e15, {}, "1", "Seed of every random draw."},

      {"participants.table",
       T::path,
       "",
       0,
       0,
       {},
       "",
       "BIDS participants table (column participant_id). Without it, participants are found by the "
       "file "
       "names of averages.file."},
      {"participants.leave_out",
       T::text_list,
       "",
       0,
       0,
       {},
       "[]",
       "Participants that are not analysed."},

      {"averages.file",
       T::path,
       "",
       0,
       0,
       {},
       "required",
       "Table of one average: time_s first, then a column for each channel. {participant} and "
       "{condition} "
       "stand for their names."},
      {"averages.counts",
       T::number_or_text,
       "",
       1,
       1e9,
       {},
       "required",
       "Table participant_id, condition, trials; or one number of trials for every average."},
      {"averages.unit", T::text, "", 0, 0, {"uV", "mV", "V"}, "\"uV\"", "Unit of the averages."},

      {"montage.positions",
       T::path,
       "",
       0,
       0,
       {},
       "\"standard\"",
       "\"standard\": by the 10-20, 10-10 and 10-5 names; or a table name x_mm y_mm z_mm, or a "
       "BIDS "
       "electrodes.tsv; {participant} stands for each person's own."},
      {"montage.space",
       T::text,
       "",
       0,
       0,
       {"head", "MNI"},
       "\"head\"",
       "Frame of the table: head (RAS axes, origin in the centre of the head's sphere) or MNI."},
      {"montage.drop",
       T::text_list,
       "",
       0,
       0,
       {},
       "[]",
       "Columns to leave out, by the names in the files: eye leads, bad leads."},
      {"montage.rename",
       T::text_map,
       "",
       0,
       0,
       {},
       "{}",
       "Columns to rename: { old = \"new\" }, by the names in the files."},
      {"montage.zero",
       T::text_list,
       "",
       0,
       0,
       {},
       "[]",
       "Channels restored as zeros: the reference of the recording."},

      {"conditions[].name", T::text, "", 0, 0, {}, "required", "Name as it stands in file names."},
      {"conditions[].*",
       T::text,
       "",
       0,
       0,
       {},
       "",
       "Any other key is a factor, its value the condition's level: beat = \"late\"."},

      {"contrasts[].name",
       T::text,
       "",
       0,
       0,
       {},
       "required",
       "Name of the contrast. Without [[contrasts]] every condition is one."},
      {"contrasts[].weights",
       T::number_map,
       "",
       0,
       0,
       {},
       "",
       "Weights of conditions: { late = 1, steady = -1 }."},
      {"contrasts[].effect",
       T::effect_map,
       "",
       0,
       0,
       {},
       "",
       "Crossed factors, first level minus second: { beat = [\"late\", \"steady\"] } is a main "
       "effect, two "
       "factors their interaction (difference of differences), and so on."},

      {"windows[].name", T::text, "", 0, 0, {}, "required", "Name of a latency window."},
      {"windows[].from_ms", T::number, "ms", -1e5, 1e5, {}, "required", "First latency."},
      {"windows[].to_ms", T::number, "ms", -1e5, 1e5, {}, "required", "Last latency."},
      {"windows[].contrasts",
       T::text_list,
       "",
       0,
       0,
       {},
       "[]",
       "Contrasts that the window is meant for; none named: all."},

      {"head.radius_mm",
       T::number_or_text,
       "mm",
       30,
       200,
       {"fit"},
       "92",
       "Scalp radius; \"fit\": of the sphere fitted to the table of positions."},
      {"head.shells",
       T::number_list,
       "",
       1e-3,
       1,
       {},
       "[0.87, 0.92, 1.0]",
       "Radii of the shells from inside to outside, as shares of the scalp's: brain, skull, "
       "scalp."},
      {"head.conductivity_S_per_m",
       T::number_list,
       "S/m",
       1e-6,
       1e3,
       {},
       "[0.33, 0.0132, 0.33]",
       "Conductivity of each shell. Brain to skull is 15 to 80 in print: an assumption."},

      {"grid.spacing_mm", T::number, "mm", 4, 12, {}, "7", "Spacing of the source lattice."},
      {"grid.points",
       T::path,
       "",
       0,
       0,
       {},
       "",
       "Table of the user's own points (name x_mm y_mm z_mm) in place of the lattice."},
      {"grid.space",
       T::text,
       "",
       0,
       0,
       {"MNI", "head"},
       "\"MNI\"",
       "Frame of grid.points: MNI, or head (then used as they are, without mapping)."},
      {"grid.atlas",
       T::path,
       "",
       0,
       0,
       {},
       "",
       "NIfTI label volume in MNI space in place of the template's gyri."},
      {"grid.atlas_table",
       T::path,
       "",
       0,
       0,
       {},
       "",
       "BIDS dseg table of the atlas: index, name, and if known abbreviation, lobe, brodmann."},

      {"noise.from",
       T::text,
       "",
       0,
       0,
       {"baseline", "residual", "table"},
       "\"baseline\"",
       "Noise covariance from the baseline of the averages; from what is left after "
       "noise.after_ms, common "
       "response and straight lines removed; or from a table."},
      {"noise.baseline_ms",
       T::number_list,
       "ms",
       -1e5,
       1e5,
       {},
       "",
       "First and last latency of the baseline; default: all samples before 0."},
      {"noise.after_ms",
       T::number,
       "ms",
       -1e5,
       1e5,
       {},
       "",
       "Latency from which the residual counts as noise."},
      {"noise.table",
       T::path,
       "",
       0,
       0,
       {},
       "",
       "Covariance of a single trial in uV^2: column name, then a column for each channel."},
      {"noise.shrinkage",
       T::number_or_text,
       "",
       0,
       1,
       {"ledoit-wolf"},
       "\"ledoit-wolf\"",
       "Weight of the scaled identity, 0 to 1, or estimated (a table is used as it is)."},

      {"inverse.methods",
       T::text_list,
       "",
       0,
       0,
       {"minimum-norm", "sloreta", "eloreta", "lcmv"},
       "[\"minimum-norm\", \"sloreta\", \"lcmv\"]",
       "Inverse methods."},
      {"inverse.regularisation",
       T::rule,
       "",
       0,
       0,
       {"gcv", "l-curve"},
       "\"gcv\"",
       "\"gcv\", \"l-curve\", { snr = 3 } or { lambda = x }: the multiplier of the contrast's "
       "noise "
       "covariance in SI units."},
      {"inverse.depth_exponent",
       T::number,
       "",
       0,
       5,
       {},
       "0.8",
       "Minimum norm: source variance is weighted by the lead field's norm^(-2p), amplitude by "
       "norm^(-p); 0: none."},

      {"lcmv.from_ms",
       T::number,
       "ms",
       -1e5,
       1e5,
       {},
       "0",
       "First latency of the data covariance, pooled over conditions."},
      {"lcmv.to_ms", T::number, "ms", -1e5, 1e5, {}, "", "Last latency; default: the end."},
      {"lcmv.table",
       T::path,
       "",
       0,
       0,
       {},
       "",
       "Data covariance in uV^2 in place of the data's own (laid out as noise.table)."},
      {"lcmv.regularisation",
       T::number,
       "",
       0,
       10,
       {},
       "0.05",
       "Share of the mean eigenvalue added to the data covariance."},
      {"lcmv.output",
       T::text,
       "",
       0,
       0,
       {"unit-gain", "unit-noise-gain", "activity-index"},
       "\"unit-noise-gain\"",
       "Scaling of the output."},
      {"lcmv.orientation",
       T::text,
       "",
       0,
       0,
       {"vector", "maximum-power"},
       "\"maximum-power\"",
       "Three components at each point, or the one direction of largest power."},
      {"lcmv.mirror_paired",
       T::true_false,
       "",
       0,
       0,
       {},
       "false",
       "Constrain each point together with its mirror image, so that correlated bilateral sources "
       "do not "
       "suppress each other."},

      {"regions[].name",
       T::text,
       "",
       0,
       0,
       {},
       "required",
       "Name of a region. Without [[regions]]: lobes by side."},
      {"regions[].gyri", T::text_list, "", 0, 0, {}, "[]", "Gyri by abbreviation or name."},
      {"regions[].lobe", T::text, "", 0, 0, {}, "", "A lobe in place of gyri."},
      {"regions[].side", T::text, "", 0, 0, {"left", "right"}, "", "One side; default: both."},

      {"files.series",
       T::true_false,
       "",
       0,
       0,
       {},
       "false",
       "Write the whole time series as volumes (VTI with a PVD index, 4-D NIfTI)."},
      {"files.courses",
       T::true_false,
       "",
       0,
       0,
       {},
       "false",
       "Write the source courses with their three components, the noise covariance and the lead "
       "field's "
       "electrodes as tables of 17 digits, so that any number can be checked outside."},
  };
}

}  // namespace

const std::vector<KeyRecord>& key_records() {
  static const std::vector<KeyRecord> records = make_records();
  return records;
}

std::string type_name(KeyType type) {
  switch (type) {
    case T::text:
      return "text";
    case T::path:
      return "a path";
    case T::number:
      return "a number";
    case T::whole_number:
      return "a whole number";
    case T::true_false:
      return "true or false";
    case T::text_list:
      return "a list of texts";
    case T::number_list:
      return "a list of numbers";
    case T::text_map:
      return "a table of texts";
    case T::number_map:
      return "a table of numbers";
    case T::effect_map:
      return "a table of level pairs";
    case T::number_or_text:
      return "a number or text";
    case T::rule:
      return "a rule";
  }
  return "";
}

std::string keys_text(const std::string& like) {
  std::string text;
  for (const auto& key : key_records()) {
    if (key.name.find(like) == std::string::npos) continue;
    std::string range = type_name(key.type);
    if (!key.unit.empty()) range += ", " + key.unit;
    if (key.least < key.most && key.most < kAny)
      range += fmt::format(", {:g} to {:g}", key.least, key.most);
    for (std::size_t i = 0; i < key.choices.size(); ++i)
      range += (i == 0 ? ": " : ", ") + key.choices[i];
    text += fmt::format("{}\n    {}\n    {}; {}\n", key.name, key.meaning, range,
                        key.standard.empty()         ? "optional"
                        : key.standard == "required" ? "required"
                                                     : "default " + key.standard);
  }
  return text;
}

}  // namespace headwater
