// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/results_tables.hpp"

#include <headwater/base/units.hpp>
#include <headwater/base/version.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace headwater {
namespace {

using Row = std::vector<std::string>;

std::string mm(double metres) {
  return format_fixed(metres / kMillimetre, 1);
}
std::string ms(double seconds) {
  return format_fixed(seconds / kMillisecond, 1);
}
std::string percent(double share) {
  return format_fixed(100 * share, 1);
}

void append(Row& row, std::initializer_list<std::string> cells) {
  row.insert(row.end(), cells.begin(), cells.end());
}

/// side, gyrus, lobe, brodmann of a source point.
struct Place {
  std::string side, gyrus, lobe, brodmann;
};

Place place_of(const ForwardModel& forward, Eigen::Index point) {
  const auto p = static_cast<std::size_t>(point);
  const int gyrus = forward.labels.gyrus[p];
  const std::string side = side_name(forward.labels.side[p]);
  if (gyrus < 0) return {side, "n/a", "n/a", "n/a"};
  const Gyrus& found = forward.labels.gyri[static_cast<std::size_t>(gyrus)];
  return {side, found.abbreviation, found.lobe, found.brodmann};
}

const std::vector<ColumnInfo> kPlaceColumns = {
    {"x_mm", "MNI coordinate, to the right", "mm"},
    {"y_mm", "MNI coordinate, forwards", "mm"},
    {"z_mm", "MNI coordinate, upwards", "mm"},
    {"side", "left, right or midline", ""},
    {"gyrus", "Gyrus of the nearest landmark (or the atlas label)", ""},
    {"lobe", "Lobe", ""},
    {"brodmann", "Customary Brodmann areas of the gyrus (textbook knowledge, not measured)", ""},
    {"nearby", "Gyri with a landmark within 15 mm, nearest first: the labels are that uncertain",
     ""},
    {"depth_mm", "Depth below the hull of the template brain, on the ray from the centre", "mm"}};

void append_place(Row& row, const ForwardModel& forward, Eigen::Index point) {
  const auto at = forward.grid.mni_m.col(point);
  const Place place = place_of(forward, point);
  append(row,
         {mm(at.x()), mm(at.y()), mm(at.z()), place.side, place.gyrus, place.lobe, place.brodmann,
          join_labels(nearby_gyri(at, 15 * kMillimetre)), mm(forward.grid.depth_m[point])});
  if (row[row.size() - 2].empty()) row[row.size() - 2] = "n/a";
}

std::vector<ColumnInfo> joined(std::vector<ColumnInfo> a, const std::vector<ColumnInfo>& b,
                               const std::vector<ColumnInfo>& c = {}) {
  a.insert(a.end(), b.begin(), b.end());
  a.insert(a.end(), c.begin(), c.end());
  return a;
}

std::string pair_note(const DipoleVerdict& verdict) {
  return fmt::format(
      "one mirrored pair leaves {} % of the window's mean map unexplained, the best single "
      "point {} %",
      percent(verdict.pair.unexplained), percent(verdict.one.unexplained));
}

const char* const kMergedNote =
    "likely false: two symmetric generators merged into one maximum; see the mirrored pair";

void append_dipole(OutputTable& table, const ForwardModel& forward, const Row& head,
                   const DipoleVerdict& verdict) {
  const auto add = [&](const std::string& model, const DipoleFit& fit, Eigen::Index point,
                       const Eigen::Vector3d& moment, bool preferred) {
    if (point < 0) return;
    Row row = head;
    row.push_back(model);
    append_place(row, forward, point);
    const Eigen::Vector3d nAm = moment / kNanoampereMetre;
    append(row, {format_number(nAm.norm(), 5), format_number(nAm.x(), 5), format_number(nAm.y(), 5),
                 format_number(nAm.z(), 5), percent(fit.unexplained),
                 format_fixed(fit.criterion, 1), preferred ? "yes" : "no"});
    table.rows.push_back(row);
  };
  const bool pair = verdict.pair_preferred;
  add("one point", verdict.one, verdict.one.point, verdict.one.moment_Am, !pair);
  add("mirrored pair", verdict.pair, verdict.pair.partner, verdict.pair.partner_moment_Am, pair);
  add("mirrored pair", verdict.pair, verdict.pair.point, verdict.pair.moment_Am, pair);
}

/// Regions of a window: those near the surface first, by falling rms, then the deep ones. A deep
/// region - its median point more than 25 mm below the hull (common practice; no source) - collects
/// leakage from every cortex around it, so that it cannot be ranked with the others.
struct RankedRegion {
  std::size_t region;
  double rms;
  bool deep;
};

bool is_deep(const ForwardModel& forward, const Region& region) {
  std::vector<double> depths;
  for (const Eigen::Index p : region.points) depths.push_back(forward.grid.depth_m[p]);
  const auto middle = depths.begin() + static_cast<std::ptrdiff_t>(depths.size() / 2);
  std::nth_element(depths.begin(), middle, depths.end());
  return *middle > 25 * kMillimetre;
}

std::vector<RankedRegion> ranked_regions(const ForwardModel& forward,
                                         const LocatedContrast& located,
                                         const SampleRange& samples) {
  std::vector<RankedRegion> ranked;
  for (Eigen::Index r = 0; r < located.courses.rms.rows(); ++r) {
    const auto region = static_cast<std::size_t>(r);
    ranked.push_back(
        {region,
         std::sqrt(located.courses.rms.row(r).segment(samples.first, samples.count).squaredNorm() /
                   static_cast<double>(samples.count)),
         is_deep(forward, forward.regions[region])});
  }
  std::stable_sort(ranked.begin(), ranked.end(), [](const RankedRegion& a, const RankedRegion& b) {
    return a.deep != b.deep ? b.deep : a.rms > b.rms;
  });
  return ranked;
}

/// The three strongest near the surface; a deep region is named where it is larger still.
std::string strongest_regions(const ForwardModel& forward,
                              const std::vector<RankedRegion>& ranked) {
  std::string text;
  const RankedRegion* deep = nullptr;
  for (std::size_t k = 0; k < ranked.size(); ++k) {
    const auto& name = forward.regions[ranked[k].region].name;
    if (!ranked[k].deep && k < 3) text += (k > 0 ? ", " : "") + name;
    if (ranked[k].deep && !deep) deep = &ranked[k];
  }
  if (deep && (ranked[0].deep || deep->rms > ranked[0].rms))
    text += fmt::format("{}{} (deep)",
                        text.empty() ? "" : "; larger: ", forward.regions[deep->region].name);
  return text;
}

const char* const kSuppressedNote =
    "LCMV suppresses correlated sources of both sides: compare lcmv.mirror_paired = true";

/// What to know about a peak, or "".
std::string peak_note(const ForwardModel& forward, const DipoleVerdict& verdict,
                      const SourceOperator& inverse, Eigen::Index point) {
  if (!verdict.pair_preferred) return "";
  if (may_be_merged(forward.grid, point)) return kMergedNote;
  return inverse.pair_blind ? kSuppressedNote : "";
}

}  // namespace

OutputTable grid_table(const ForwardModel& forward) {
  OutputTable table{
      "Source points of the analysis. " + forward.labels.source,
      joined({{"point", "Number of the point, from 1", ""}}, kPlaceColumns,
             {{"mirror", "Number of the point that is its mirror image, n/a: none", ""}}),
      {}};
  for (Eigen::Index p = 0; p < forward.grid.size(); ++p) {
    Row row{std::to_string(p + 1)};
    append_place(row, forward, p);
    const Eigen::Index mirror = forward.grid.mirror[static_cast<std::size_t>(p)];
    row.push_back(mirror >= 0 ? std::to_string(mirror + 1) : "n/a");
    table.rows.push_back(row);
  }
  return table;
}

OutputTable positions_table(const std::string& what, const Labels& names,
                            const Eigen::Matrix3Xd& head_m) {
  OutputTable table{what + ", in the head frame (RAS axes, origin in the centre of the sphere).",
                    {{"name", "Name", ""},
                     {"x_mm", "To the right", "mm"},
                     {"y_mm", "Forwards", "mm"},
                     {"z_mm", "Upwards", "mm"}},
                    {}};
  for (Eigen::Index i = 0; i < head_m.cols(); ++i) {
    Row row{names[static_cast<std::size_t>(i)]};
    for (Eigen::Index axis = 0; axis < 3; ++axis)
      row.push_back(format_number(head_m(axis, i) / kMillimetre, 17));
    table.rows.push_back(row);
  }
  return table;
}

OutputTable dipole_table(const ForwardModel& forward, const ContrastWaveform& contrast,
                         const std::vector<WindowDipoles>& dipoles) {
  OutputTable table{
      "Second opinion: the one point, or the one mirrored pair of points, whose dipoles explain a "
      "scalp map "
      "best; of each window's mean map and of each of its samples.",
      joined({{"window", "Latency window", ""},
              {"latency_ms", "Sample, or 'mean' for the window's mean map", "ms"},
              {"model", "one point, or mirrored pair (two rows, left half first)", ""}},
             kPlaceColumns,
             {{"moment_nAm", "Length of the dipole moment", "nA m"},
              {"moment_x_nAm", "Moment to the right", "nA m"},
              {"moment_y_nAm", "Moment forwards", "nA m"},
              {"moment_z_nAm", "Moment upwards", "nA m"},
              {"unexplained_percent", "Residual variance of the scalp map", "%"},
              {"criterion", "Bayesian information criterion, lower is better", ""},
              {"preferred", "yes for the model that the criterion prefers (a pair must win by 2)",
               ""}}),
      {}};
  for (const auto& window : dipoles) {
    append_dipole(table, forward, {window.window.name, "mean"}, window.mean);
    for (std::size_t t = 0; t < window.at_sample.size(); ++t)
      append_dipole(table, forward,
                    {window.window.name,
                     ms(contrast.times_s[window.samples.first + static_cast<Eigen::Index>(t)])},
                    window.at_sample[t]);
  }
  return table;
}

OutputTable peak_table(const ForwardModel& forward, const LocatedContrast& located,
                       const std::vector<WindowDipoles>& dipoles) {
  const auto& inverse = located.inverse;
  OutputTable table{
      "Where the map of each window is largest. Template head, spherical model: centimetres, not "
      "millimetres.",
      joined({{"window", "Latency window", ""},
              {"kind",
               "mirrored pair (of dipoles, where it explains the window's mean map better than any "
               "one point) or peak (local maximum of the map)",
               ""},
              {"rank", "Order by value", ""}},
             kPlaceColumns,
             {{"value", inverse.quantity + " (peak: rms over the window; pair: dipole moment)", ""},
              {"unit", "Unit of value; n/a: multiples of the noise", ""},
              {"latency_ms", "Sample of largest amplitude within the window", "ms"},
              {"note", "What to know about this row", ""}}),
      {}};
  for (std::size_t w = 0; w < located.windows.size(); ++w) {
    const auto& window = located.windows[w];
    const DipoleVerdict& verdict = dipoles[w].mean;
    if (verdict.pair_preferred) {
      const auto add = [&](Eigen::Index point, const Eigen::Vector3d& moment) {
        Row row{window.window.name, "mirrored pair", "1"};
        append_place(row, forward, point);
        append(row, {format_number(moment.norm() / kNanoampereMetre, 5), "nA m", "n/a",
                     pair_note(verdict)});
        table.rows.push_back(row);
      };
      add(verdict.pair.partner, verdict.pair.partner_moment_Am);
      add(verdict.pair.point, verdict.pair.moment_Am);
    }
    int rank = 0;
    for (const auto& peak : window.peaks) {
      Row row{window.window.name, "peak", std::to_string(++rank)};
      append_place(row, forward, peak.point);
      const std::string note = peak_note(forward, verdict, inverse, peak.point);
      append(row, {format_number(peak.value / inverse.unit_in_SI, 6),
                   inverse.unit.empty() ? "n/a" : inverse.unit, ms(peak.latency_s),
                   note.empty() ? "n/a" : note});
      table.rows.push_back(row);
    }
  }
  return table;
}

OutputTable region_table(const ForwardModel& forward, const LocatedContrast& located) {
  const auto& inverse = located.inverse;
  OutputTable table{
      "Regions in each window, largest first. rms: root mean square over points and samples "
      "(cannot "
      "cancel). projected: mean over the window of the course along the region's dominant pattern, "
      "positive where it points outwards on balance.",
      {{"window", "Latency window", ""},
       {"rank", "Order by rms, among regions near the surface, then among deep ones", ""},
       {"region", "Region", ""},
       {"deep",
        "yes: the median point lies more than 25 mm below the hull, where leakage from all around "
        "collects",
        ""},
       {"points", "Source points", ""},
       {"rms", inverse.quantity, inverse.unit},
       {"projected", inverse.quantity + ", signed", inverse.unit},
       {"dominant_share", "Share of the region's variance in its dominant pattern", ""}},
      {}};
  for (const auto& window : located.windows) {
    int rank = 0;
    bool deep_began = false;
    for (const auto& entry : ranked_regions(forward, located, window.samples)) {
      if (entry.deep && !deep_began) rank = 0;
      deep_began = entry.deep;
      const auto r = static_cast<Eigen::Index>(entry.region);
      const auto& region = forward.regions[entry.region];
      const double projected = located.courses.projected.row(r)
                                   .segment(window.samples.first, window.samples.count)
                                   .mean();
      table.rows.push_back({window.window.name, std::to_string(++rank), region.name,
                            entry.deep ? "yes" : "no", std::to_string(region.points.size()),
                            format_number(entry.rms / inverse.unit_in_SI, 6),
                            format_number(projected / inverse.unit_in_SI, 6),
                            format_fixed(located.courses.share[r], 3)});
    }
  }
  return table;
}

OutputTable region_course_table(const ForwardModel& forward, const ContrastWaveform& contrast,
                                const LocatedContrast& located) {
  const auto& inverse = located.inverse;
  OutputTable table{
      "Time courses of regions: along the dominant pattern (signed), and root mean square "
      "over points.",
      {{"time_s", "Latency", "s"}},
      {}};
  for (const auto& region : forward.regions) {
    table.columns.push_back({file_label(region.name) + "_projected",
                             region.name + ": " + inverse.quantity + " along the dominant pattern",
                             inverse.unit});
    table.columns.push_back({file_label(region.name) + "_rms",
                             region.name + ": " + inverse.quantity + ", rms", inverse.unit});
  }
  for (Eigen::Index t = 0; t < contrast.times_s.size(); ++t) {
    Row row{format_number(contrast.times_s[t], 9)};
    for (Eigen::Index r = 0; r < located.courses.rms.rows(); ++r) {
      row.push_back(format_number(located.courses.projected(r, t) / inverse.unit_in_SI, 6));
      row.push_back(format_number(located.courses.rms(r, t) / inverse.unit_in_SI, 6));
    }
    table.rows.push_back(std::move(row));
  }
  return table;
}

OutputTable index_table(const LocatedContrast& located) {
  OutputTable table{
      "Indices of power: laterality (right - left) / (right + left), temporal-parietal (temporal - "
      "parietal) "
      "/ (temporal + parietal). The interval covers the contrast's noise only, not the head model "
      "nor the "
      "method's own preference for a place.",
      {{"window", "Latency window", ""},
       {"index", "Which index", ""},
       {"value", "-1 to 1", ""},
       {"low", "Lower end of the 95 % interval", ""},
       {"high", "Upper end of the 95 % interval", ""}},
      {}};
  for (const auto& window : located.windows)
    for (const auto& index : window.indices)
      table.rows.push_back({window.window.name, index.name, format_fixed(index.value, 3),
                            format_fixed(index.low, 3), format_fixed(index.high, 3)});
  return table;
}

Json fit_json(const ParticipantData& participant, const ContrastWaveform& contrast,
              const LocatedContrast& located) {
  Json json = Json::object();
  json.set("Method", located.inverse.method);
  json.set("Quantity", located.inverse.quantity);
  json.set("Unit", located.inverse.unit.empty() ? Json() : Json(located.inverse.unit));
  json.set("EffectiveTrials", contrast.effective_trials);
  const auto& noise = participant.noise;
  if (!noise.source.empty()) {
    Json part = Json::object();
    part.set("Source", noise.source)
        .set("Rank", noise.rank)
        .set("Condition", noise.condition)
        .set("Shrinkage", noise.shrinkage)
        .set("DegreesOfFreedom", noise.samples)
        .set("IndependentSamples", noise.independent_samples);
    json.set("NoiseCovariance", part);
  }
  const auto& choice = located.regularisation;
  Json regularisation = Json::object();
  regularisation.set("Rule", choice.rule)
      .set("Lambda", choice.used)
      .set("EffectiveParameters", choice.effective_parameters);
  Json choices = Json::object();
  choices.set("gcv", choice.gcv)
      .set("l-curve", choice.l_curve)
      .set("snr 3", choice.snr3)
      .set("discrepancy", choice.discrepancy);
  choices.set("gcv at the edge of its search", choice.gcv_at_edge)
      .set("l-curve at the edge of its search", choice.l_curve_at_edge);
  regularisation.set("AllChoices", choices);
  json.set("Regularisation", regularisation);
  if (located.iterations > 0)
    json.set("Iterations", located.iterations).set("Converged", located.converged);
  Json windows = Json::object();
  for (const auto& window : located.windows) {
    Json part = Json::object();
    part.set("ExplainedVariance", window.fit.explained_variance)
        .set("ResidualInNoiseUnits", window.fit.residual_noise)
        .set("SignalToNoise", window.fit.snr);
    windows.set(window.window.name, part);
  }
  json.set("Windows", windows);
  json.set("Caution", caution());
  return json;
}

std::vector<SummaryRow> summarise(const ParticipantData& participant,
                                  const ContrastWaveform& contrast, const LocatedContrast& located,
                                  const std::vector<WindowDipoles>& dipoles) {
  const auto& forward = *participant.forward;
  std::vector<SummaryRow> rows;
  for (std::size_t w = 0; w < located.windows.size(); ++w) {
    const auto& window = located.windows[w];
    const DipoleVerdict& verdict = dipoles[w].mean;
    const std::string strongest =
        strongest_regions(forward, ranked_regions(forward, located, window.samples));
    const auto add = [&](const std::string& kind, Eigen::Index point, double value,
                         const std::string& unit, double latency_s, const std::string& note) {
      const Place place = place_of(forward, point);
      rows.push_back({participant.name, contrast.name, located.inverse.method, window.window.name,
                      kind, forward.grid.mni_m.col(point), kind == "peak" ? place.side : "both",
                      place.gyrus, place.lobe, value, unit, latency_s,
                      window.fit.explained_variance, window.fit.snr, strongest, note});
    };
    if (verdict.pair_preferred)
      add("mirrored pair", verdict.pair.point, verdict.pair.moment_Am.norm() / kNanoampereMetre,
          "nA m", std::nan(""), pair_note(verdict));
    if (!window.peaks.empty()) {
      const Peak& peak = window.peaks[0];
      add("peak", peak.point, peak.value / located.inverse.unit_in_SI, located.inverse.unit,
          peak.latency_s, peak_note(forward, verdict, located.inverse, peak.point));
    }
  }
  return rows;
}

OutputTable summary_table(const std::vector<SummaryRow>& rows) {
  OutputTable table{
      "The leading answer of each participant, contrast, method and window: the mirrored pair "
      "where one "
      "explains the window's mean map better than any one point, and the map's largest peak.",
      {{"participant_id", "Participant, or 'mean' of all", ""},
       {"contrast", "Contrast", ""},
       {"method", "Inverse method of the peak", ""},
       {"window", "Latency window", ""},
       {"kind", "mirrored pair (coordinates of its right half) or peak", ""},
       {"x_mm", "MNI coordinate, to the right", "mm"},
       {"y_mm", "MNI coordinate, forwards", "mm"},
       {"z_mm", "MNI coordinate, upwards", "mm"},
       {"side", "left, right, midline, or both (pair)", ""},
       {"gyrus", "Gyrus", ""},
       {"lobe", "Lobe", ""},
       {"value", "Peak: map value; pair: dipole moment", ""},
       {"unit", "Unit of value; n/a: multiples of the noise", ""},
       {"latency_ms", "Sample of largest amplitude", "ms"},
       {"explained_percent", "Variance of the window explained by the distributed estimate", "%"},
       {"snr", "rms of the whitened contrast: 1 is noise alone", ""},
       {"strongest_regions", "Three regions of largest rms", ""},
       {"note", "What to know about this row", ""}},
      {}};
  for (const auto& row : rows)
    table.rows.push_back({row.participant, row.contrast, row.method, row.window, row.kind,
                          mm(row.mni_m.x()), mm(row.mni_m.y()), mm(row.mni_m.z()), row.side,
                          row.gyrus, row.lobe, format_number(row.value, 5),
                          row.unit.empty() ? "n/a" : row.unit, ms(row.latency_s),
                          percent(row.explained_variance), format_number(row.snr, 4),
                          row.strongest_regions, row.note.empty() ? "n/a" : row.note});
  return table;
}

Json summary_json(const std::vector<SummaryRow>& rows) {
  Json list = Json::array();
  for (const auto& row : rows) {
    Json entry = Json::object();
    entry.set("participant_id", row.participant)
        .set("contrast", row.contrast)
        .set("method", row.method)
        .set("window", row.window)
        .set("kind", row.kind)
        .set("x_mm", row.mni_m.x() / kMillimetre)
        .set("y_mm", row.mni_m.y() / kMillimetre)
        .set("z_mm", row.mni_m.z() / kMillimetre)
        .set("side", row.side)
        .set("gyrus", row.gyrus)
        .set("lobe", row.lobe)
        .set("value", row.value)
        .set("unit", row.unit)
        .set("latency_ms", row.latency_s / kMillisecond)
        .set("explained_percent", 100 * row.explained_variance)
        .set("snr", row.snr)
        .set("strongest_regions", row.strongest_regions)
        .set("note", row.note);
    list.push(entry);
  }
  return list;
}

}  // namespace headwater
