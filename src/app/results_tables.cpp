// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/results_tables.hpp"

#include "app/results_places.hpp"

#include <headwater/base/units.hpp>

#include <cmath>

namespace headwater {
namespace {

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

}  // namespace

OutputTable grid_table(const ForwardModel& forward) {
  OutputTable table{
      "Source points of the analysis. " + forward.labels.source,
      with_place_columns(
          {{"point", "Number of the point, from 1", ""}},
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
      with_place_columns(
          {{"window", "Latency window", ""},
           {"latency_ms", "Sample, or 'mean' for the window's mean map", "ms"},
           {"model", "one point, or mirrored pair (two rows, left half first)", ""}},
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
      with_place_columns(
          {{"window", "Latency window", ""},
           {"kind",
            "mirrored pair (of dipoles, where it explains the window's mean map better than any "
            "one point) or peak (local maximum of the map)",
            ""},
           {"rank", "Order by value", ""}},
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
                     joined_notes(pair_note(forward, verdict), dipoles[w].influence.note)});
        table.rows.push_back(row);
      };
      add(verdict.pair.partner, verdict.pair.partner_moment_Am);
      add(verdict.pair.point, verdict.pair.moment_Am);
    }
    int rank = 0;
    for (const auto& peak : window.peaks) {
      Row row{window.window.name, "peak", std::to_string(++rank)};
      append_place(row, forward, peak.point);
      const std::string note = joined_notes(peak_note(forward, verdict, inverse, peak.point),
                                            rank == 1 ? window.influence.note : "");
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

}  // namespace headwater
