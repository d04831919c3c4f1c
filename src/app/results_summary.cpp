// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/results_places.hpp"
#include "app/results_tables.hpp"

#include <headwater/base/units.hpp>
#include <headwater/base/version.hpp>

#include <Eigen/Eigenvalues>

#include <algorithm>
#include <cmath>

namespace headwater {

namespace {

/// Rank, condition and size of the contrast's own noise.
Json contrast_noise_json(const ContrastWaveform& contrast) {
  const Eigen::VectorXd variances =
      Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(contrast.noise_V2, Eigen::EigenvaluesOnly)
          .eigenvalues();
  const double largest = variances[variances.size() - 1];
  Json contrast_noise = Json::object();
  contrast_noise.set("Rank", (variances.array() > 1e-10 * largest).count())
      .set("Condition", largest / variances[0])
      .set("RootMeanSquare_uV", std::sqrt(variances.mean()) / kMicrovolt);
  return contrast_noise;
}

/// The choice in use, and beside it what every rule would take.
Json regularisation_json(const RegularisationChoice& choice) {
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
  return regularisation;
}

}  // namespace

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
  json.set("ContrastNoise", contrast_noise_json(contrast));
  json.set("Regularisation", regularisation_json(located.regularisation));
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
  const bool follows_noise =
      std::any_of(located.windows.begin(), located.windows.end(),
                  [](const LocatedWindow& window) { return window.fit.residual_noise < 0.5; });
  if (follows_noise)
    json.set("Note",
             "The residual is far below the noise: the estimate follows part of the noise. Compare "
             "inverse.regularisation = { snr = 3 }, or the discrepancy among the choices above.");
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
          "nA m", std::nan(""),
          joined_notes(pair_note(forward, verdict), dipoles[w].influence.note));
    if (!window.peaks.empty()) {
      const Peak& peak = window.peaks[0];
      add("peak", peak.point, peak.value / located.inverse.unit_in_SI, located.inverse.unit,
          peak.latency_s,
          joined_notes(peak_note(forward, verdict, located.inverse, peak.point),
                       window.influence.note));
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
