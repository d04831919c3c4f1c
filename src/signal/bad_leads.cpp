// SPDX-License-Identifier: GPL-3.0-or-later
// What the rounds over the leads share is made once: each trial with every lead's mean over time
// taken off (X, M by T), and its products C = X X' (M by M). In the average reference of a set of
// leads, H = I - 1 1'/M, the products are H C H: C less its row means and column means, plus the
// mean of all. With the spline's predictions W of each lead from the others,
//   sum over time of prediction^2          = (W C W')_ii
//   sum over time of (lead - prediction)^2 = C_ii - 2 (W C)_ii + (W C W')_ii,
// so that a round costs M^3 for each trial and not M^2 T.
#include "signal/problems.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/bad_leads.hpp>
#include <headwater/signal/spherical_spline.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

namespace headwater {
namespace {

using Index = Eigen::Index;
using Indices = std::vector<Index>;

constexpr double kMadToDeviation = 1.4826;  // of normal noise: 1 / (0.75 quantile)
constexpr Index kMostTrials = 200;
/// Leads that differ by less are alike: the least scale of the robust z of a logarithm.
constexpr double kLeastScale = 0.1;
/// A spread or an error below this part of the median over leads is none at all.
constexpr double kNothing = 1e-6;
constexpr const char* kSaidSo = "said so";
constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

std::size_t at(Index i) {
  return static_cast<std::size_t>(i);
}

/// Median; of an even number the mean of the middle two. NaN of none. Reorders.
double median(std::vector<double>& values) {
  if (values.empty()) return kNaN;
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  if (values.size() % 2 != 0) return *middle;
  return (*middle + *std::max_element(values.begin(), middle)) / 2;
}

/// Median absolute deviation from the median, as the standard deviation of normal noise. Reorders.
double robust_spread(std::vector<double>& values) {
  const double centre = median(values);
  for (double& value : values) value = std::abs(value - centre);
  return kMadToDeviation * median(values);
}

/// Robust z over leads of the logarithm.
Eigen::VectorXd robust_z_of_log(const Eigen::VectorXd& values) {
  std::vector<double> sorted(values.begin(), values.end());
  const double least = std::max(kNothing * median(sorted), std::numeric_limits<double>::min());
  const Eigen::VectorXd logs = values.array().max(least).log();
  sorted.assign(logs.begin(), logs.end());
  const double centre = median(sorted);
  return (logs.array() - centre) / std::max(robust_spread(sorted), kLeastScale);
}

/// The trials that are looked at, centred, with their products over all leads.
struct Material {
  std::vector<Eigen::MatrixXd> trials;    // M by T
  std::vector<Eigen::MatrixXd> products;  // M by M
};

Material make_material(const Eigen::MatrixXd& data_V, Index trials) {
  const Index samples = data_V.cols() / trials;
  const Index count = std::min(trials, kMostTrials);
  Material material;
  for (Index k = 0; k < count; ++k) {
    Eigen::MatrixXd x = data_V.middleCols(k * trials / count * samples, samples);
    x.colwise() -= x.rowwise().mean().eval();
    Eigen::MatrixXd products = Eigen::MatrixXd::Zero(x.rows(), x.rows());
    products.selfadjointView<Eigen::Lower>().rankUpdate(x);
    material.products.emplace_back(products.selfadjointView<Eigen::Lower>());
    material.trials.push_back(std::move(x));
  }
  return material;
}

/// Figures of the leads of a set, in the set's order.
struct Figures {
  Eigen::VectorXd deviation, correlation, spline_error, spline_z;
};

/// Median over trials of each lead's robust spread in the average reference of the set.
Eigen::VectorXd spreads(const Material& material, const Indices& set) {
  const auto count = static_cast<Index>(set.size());
  std::vector<std::vector<double>> of_lead(set.size());
  std::vector<double> values;
  for (const Eigen::MatrixXd& trial : material.trials) {
    const Eigen::MatrixXd x = trial(set, Eigen::all);
    const Eigen::RowVectorXd mean = x.colwise().mean();
    for (Index i = 0; i < count; ++i) {
      const Eigen::RowVectorXd course = x.row(i) - mean;
      values.assign(course.begin(), course.end());
      of_lead[at(i)].push_back(robust_spread(values));
    }
  }
  Eigen::VectorXd result(count);
  for (Index i = 0; i < count; ++i) result(i) = median(of_lead[at(i)]);
  return result;
}

/// Largest correlation with a neighbour; NaN without neighbours, 0 of a lead that does not vary.
double largest_correlation(const Eigen::MatrixXd& products, Index lead, const Indices& neighbours) {
  double largest = kNaN;
  for (const Index other : neighbours) {
    const double power = products(lead, lead) * products(other, other);
    const double correlation = power > 0 ? products(lead, other) / std::sqrt(power) : 0;
    if (!(correlation <= largest)) largest = correlation;
  }
  return largest;
}

Figures figures_of(const Montage& montage, const Material& material, const Indices& set) {
  const auto count = static_cast<Index>(set.size());
  Montage part;
  for (const Index i : set) part.labels.push_back(montage.labels[at(i)]);
  part.positions = montage.positions(Eigen::all, set);
  const auto neighbours = channel_neighbours(part);
  const Eigen::MatrixXd prediction = spline_prediction(part.positions);
  std::vector<std::vector<double>> correlations(set.size()), errors(set.size());
  for (const Eigen::MatrixXd& all : material.products) {
    Eigen::MatrixXd products = all(set, set);
    products.rowwise() -= products.colwise().mean().eval();
    products.colwise() -= products.rowwise().mean().eval();
    const Eigen::MatrixXd mixed = prediction * products;
    for (Index i = 0; i < count; ++i) {
      correlations[at(i)].push_back(largest_correlation(products, i, neighbours[at(i)]));
      const double predicted = std::max(0.0, mixed.row(i).dot(prediction.row(i)));
      const double missed = std::max(0.0, products(i, i) - 2 * mixed(i, i) + predicted);
      errors[at(i)].push_back(predicted > 0 ? std::sqrt(missed / predicted) : missed > 0 ? 1 : 0);
    }
  }
  Figures figures{spreads(material, set), Eigen::VectorXd(count), Eigen::VectorXd(count), {}};
  for (Index i = 0; i < count; ++i) {
    const bool alone = neighbours[at(i)].empty();
    figures.correlation(i) = alone ? kNaN : median(correlations[at(i)]);
    figures.spline_error(i) = median(errors[at(i)]);
  }
  figures.deviation = robust_z_of_log(figures.deviation);
  figures.spline_z = robust_z_of_log(figures.spline_error);
  return figures;
}

/// By what factor the figures pass their limits (above 1: bad), and what then is the reason.
struct Verdict {
  double severity = 0;
  std::string reason;
};

Verdict judge(const LeadFigures& lead, const BadLeadOptions& options) {
  Verdict verdict;
  const auto add = [&](double severity, const std::string& reason) {
    if (severity > verdict.severity) verdict.severity = severity;
    if (severity > 1) verdict.reason += (verdict.reason.empty() ? "" : ", ") + reason;
  };
  add(std::abs(lead.deviation) / options.deviation_limit,
      fmt::format("deviation z {:.1f}", lead.deviation));
  if (!std::isnan(lead.correlation))
    add((1 - lead.correlation) / (1 - options.correlation_limit),
        fmt::format("correlation {:.2f}", lead.correlation));
  if (lead.spline_error > 1)
    add(lead.spline_z / options.spline_limit,
        fmt::format("spline error {:.1f} (z {:.1f})", lead.spline_error, lead.spline_z));
  add(lead.marked / options.marked_limit,
      fmt::format("alone beyond limits in {:.0f} % of trials", 100 * lead.marked));
  return verdict;
}

/// Share of trials in which each lead breaks a limit while fewer than half of its neighbours do: a
/// blink is the business of the trial, not of the frontal leads.
Eigen::VectorXd marked_alone(const Montage& montage,
                             const Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic>& marked) {
  const auto neighbours = channel_neighbours(montage);
  Eigen::VectorXd share = Eigen::VectorXd::Zero(marked.cols());
  for (Index lead = 0; lead < marked.cols(); ++lead) {
    const auto& near = neighbours[at(lead)];
    for (Index k = 0; k < marked.rows(); ++k) {
      if (!marked(k, lead)) continue;
      const auto with =
          std::count_if(near.begin(), near.end(), [&](Index other) { return marked(k, other); });
      if (near.empty() || 2 * static_cast<std::size_t>(with) < near.size()) share[lead] += 1;
    }
  }
  return share / static_cast<double>(marked.rows());
}

/// Positions of the names; both lists and all problems at once.
void find_fixed(const Montage& montage, const BadLeadOptions& options, std::vector<bool>& bad,
                std::vector<bool>& good) {
  std::vector<std::string> problems;
  const auto mark = [&](const Labels& names, const char* what, std::vector<bool>& marks) {
    for (const std::string& name : names) {
      if (const auto index = find_label_any_case(montage.labels, name))
        marks[at(*index)] = true;
      else
        problems.push_back(fmt::format("no lead '{}' to be called {}.{}", name, what,
                                       did_you_mean(name, montage.labels)));
    }
  };
  mark(options.bad, "bad", bad);
  mark(options.good, "good", good);
  for (std::size_t i = 0; i < bad.size(); ++i)
    if (bad[i] && good[i])
      problems.push_back(
          fmt::format("lead '{}' is said to be both bad and good.", montage.labels[i]));
  if (!problems.empty()) throw InputError(problem_list("Bad leads", problems));
}

void check_shapes(const Montage& montage, const Eigen::MatrixXd& data_V, Index trials,
                  const Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic>& marked) {
  const auto leads = static_cast<Index>(montage.labels.size());
  if (trials < 1 || data_V.rows() != leads || montage.positions.cols() != leads ||
      data_V.cols() < trials || data_V.cols() % trials != 0 ||
      (marked.size() > 0 && (marked.rows() != trials || marked.cols() != leads)))
    throw std::logic_error(
        fmt::format("check_leads: {} leads, {} positions, data {} by {}, {} trials, marks {} by {}",
                    leads, montage.positions.cols(), data_V.rows(), data_V.cols(), trials,
                    marked.rows(), marked.cols()));
}

void put_figures(const Figures& figures, Index from, LeadFigures& lead) {
  lead.deviation = figures.deviation(from);
  lead.correlation = figures.correlation(from);
  lead.spline_error = figures.spline_error(from);
  lead.spline_z = figures.spline_z(from);
}

void put_figures(const Figures& figures, const Indices& set, std::vector<LeadFigures>& leads) {
  for (std::size_t k = 0; k < set.size(); ++k)
    put_figures(figures, static_cast<Index>(k), leads[at(set[k])]);
}

/// Place in the set of the worst lead, if one is bad. A lead that is said to be good stays.
Indices::iterator find_worst(Indices& set, const std::vector<LeadFigures>& leads,
                             const std::vector<bool>& good, const BadLeadOptions& options) {
  double severity = 1;
  auto worst = set.end();
  for (auto it = set.begin(); it != set.end(); ++it) {
    if (good[at(*it)]) continue;
    const double its = judge(leads[at(*it)], options).severity;
    if (its > severity) {
      severity = its;
      worst = it;
    }
  }
  return worst;
}

/// Figures of each lead that is out, as one of the good ones and itself. A lead that was blamed for
/// what a neighbour did is no longer bad by them, and comes back.
void look_again(const Montage& montage, const Material& material, const Indices& out,
                const BadLeadOptions& options, Indices& set, std::vector<LeadFigures>& leads) {
  for (const Index i : out) {
    Indices with = set;
    with.insert(std::upper_bound(with.begin(), with.end(), i), i);
    const auto place = std::find(with.begin(), with.end(), i) - with.begin();
    LeadFigures& lead = leads[at(i)];
    put_figures(figures_of(montage, material, with), place, lead);
    if (lead.reason == kSaidSo) continue;
    const Verdict verdict = judge(lead, options);
    lead.bad = verdict.severity > 1;
    lead.reason = verdict.reason;
    if (!lead.bad) set = with;
  }
}

}  // namespace

Labels LeadCheck::bad() const {
  Labels names;
  for (const LeadFigures& lead : leads)
    if (lead.bad) names.push_back(lead.channel);
  return names;
}

LeadCheck check_leads(const Montage& montage, const Eigen::MatrixXd& data_V, Index trials,
                      const Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic>& marked,
                      const BadLeadOptions& options) {
  check_shapes(montage, data_V, trials, marked);
  const std::size_t count = montage.labels.size();
  std::vector<bool> bad(count, false), good(count, false);
  find_fixed(montage, options, bad, good);
  LeadCheck check;
  Indices set, out;
  const Eigen::VectorXd alone = marked.size() > 0
                                    ? marked_alone(montage, marked)
                                    : Eigen::VectorXd::Zero(static_cast<Index>(count));
  for (std::size_t i = 0; i < count; ++i) {
    const auto column = static_cast<Index>(i);
    LeadFigures lead;
    lead.channel = montage.labels[i];
    lead.marked = alone[column];
    lead.bad = bad[i];
    if (bad[i]) lead.reason = kSaidSo;
    check.leads.push_back(lead);
    (bad[i] ? out : set).push_back(column);
  }
  const Material material = make_material(data_V, trials);
  const auto judge_set = [&] { put_figures(figures_of(montage, material, set), set, check.leads); };
  judge_set();
  bool poor = false;
  while (options.find && !poor) {
    const auto worst = find_worst(set, check.leads, good, options);
    if (worst == set.end()) break;
    check.leads[at(*worst)].bad = true;
    out.push_back(*worst);
    set.erase(worst);
    poor = 4 * out.size() >= count;
    judge_set();
  }
  look_again(montage, material, out, options, set, check.leads);
  if (!out.empty()) judge_set();
  if (poor)
    check.note = fmt::format(
        "{} of {} leads are bad and no more were looked for: the recording is poor. Look at its "
        "leads, or state limits or the bad leads.",
        count - set.size(), count);
  return check;
}

}  // namespace headwater
