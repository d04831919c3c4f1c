// SPDX-License-Identifier: GPL-3.0-or-later
#include "lead_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/bad_leads.hpp>

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace headwater {
namespace {

using Marks = Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic>;

class SignalBadLeads : public testing::Test {
 protected:
  static constexpr Eigen::Index trials_ = 12, samples_ = 100;
  Montage montage_ = standard_montage(thirty_two_leads(), 0.092);
  Eigen::MatrixXd data_ = make();
  std::size_t place(const std::string& name) const {
    return static_cast<std::size_t>(*find_label(montage_.labels, name));
  }
  LeadCheck check(const BadLeadOptions& options = {}, const Marks& marked = {}) const {
    return check_leads(montage_, data_, trials_, marked, options);
  }
  void spoil(const std::string& name, std::uint64_t seed = 9) {
    RandomStream random(seed, "spoiled");
    data_.row(static_cast<Eigen::Index>(place(name))) +=
        60e-6 * random.normal_matrix(1, data_.cols());
  }

 private:
  Eigen::MatrixXd make() const {
    RandomStream random(3, "background");
    return background(montage_, trials_, samples_, random);
  }
};

TEST_F(SignalBadLeads, CleanLeadsAreGoodAndInTheOrderOfTheChannels) {
  const LeadCheck result = check();
  ASSERT_EQ(result.leads.size(), montage_.labels.size());
  for (std::size_t i = 0; i < result.leads.size(); ++i) {
    EXPECT_EQ(result.leads[i].channel, montage_.labels[i]);
    EXPECT_FALSE(result.leads[i].bad) << result.leads[i].channel << result.leads[i].reason;
    EXPECT_EQ(result.leads[i].reason, "");
    EXPECT_EQ(result.leads[i].marked, 0);
  }
  EXPECT_EQ(result.note, "");
}

TEST_F(SignalBadLeads, NamesReasonsWithTheirFigures) {
  spoil("C3");
  const LeadFigures lead = check().leads[place("C3")];
  EXPECT_TRUE(lead.bad);
  EXPECT_GT(lead.deviation, 5);
  EXPECT_NE(lead.reason.find("deviation z"), std::string::npos);
  EXPECT_NE(lead.reason.find("correlation "), std::string::npos);
  EXPECT_EQ(check().bad(), Labels{"C3"});
}

// Two neighbours that are bad in different ways, one so large that it fills the average reference.
TEST_F(SignalBadLeads, FindsSmallTroubleBehindLargeTrouble) {
  spoil("C3");
  const auto lead = static_cast<Eigen::Index>(place("CP5"));
  RandomStream random(4, "large");
  data_.row(lead) += 0.1 * random.normal_matrix(1, data_.cols());
  Labels bad = check().bad();
  std::sort(bad.begin(), bad.end());
  EXPECT_EQ(bad, (Labels{"C3", "CP5"}));
}

// Spread: scaled alike; logarithms shift by the same. Reference and offsets: taken off. The
// subtraction of a signal of 1e-3 V from 1e-5 V loses 1e-14 / 1e-5 of products.
TEST_F(SignalBadLeads, FiguresDoNotDependOnScaleReferenceOffsetsOrOrder) {
  spoil("Pz");
  const LeadCheck before = check();
  RandomStream random(8, "reference");
  const Eigen::RowVectorXd common = 1e-4 * random.normal_matrix(1, data_.cols());
  data_.rowwise() += common;
  data_.colwise() += 1e-3 * Eigen::VectorXd::LinSpaced(data_.rows(), -1, 1);
  data_ *= 1e8;
  data_.colwise().reverseInPlace();
  std::reverse(montage_.labels.begin(), montage_.labels.end());
  montage_.positions.rowwise().reverseInPlace();
  const LeadCheck after = check();
  ASSERT_EQ(before.leads.size(), after.leads.size());
  for (const LeadFigures& lead : before.leads) {
    const LeadFigures& same = after.leads[place(lead.channel)];
    EXPECT_NEAR(lead.deviation, same.deviation, 1e-7);
    EXPECT_NEAR(lead.correlation, same.correlation, 1e-7);
    EXPECT_NEAR(lead.spline_error, same.spline_error, 1e-7);
    EXPECT_NEAR(lead.spline_z, same.spline_z, 1e-6);
    EXPECT_EQ(lead.bad, same.bad);
  }
}

TEST_F(SignalBadLeads, UserHasTheLastWord) {
  spoil("C3");
  BadLeadOptions options;
  options.bad = {"fz"};
  options.good = {"C3"};
  const LeadCheck result = check(options);
  EXPECT_EQ(result.bad(), Labels{"Fz"});
  EXPECT_EQ(result.leads[place("Fz")].reason, "said so");
  EXPECT_GT(result.leads[place("Fz")].spline_error, 0);  // it has figures all the same
  options.find = false;
  options.good.clear();
  EXPECT_EQ(check(options).bad(), Labels{"Fz"});
}

TEST_F(SignalBadLeads, MarksCountAsAShareOfTrials) {
  Marks marked = Marks::Constant(trials_, data_.rows(), false);
  marked.col(static_cast<Eigen::Index>(place("Oz"))).head(4) = true;  // 33 %
  marked.col(static_cast<Eigen::Index>(place("O1"))).head(3) = true;  // 25 %
  const LeadCheck result = check({}, marked);
  EXPECT_EQ(result.bad(), Labels{"Oz"});
  EXPECT_EQ(result.leads[place("Oz")].reason, "alone beyond limits in 33 % of trials");
  EXPECT_DOUBLE_EQ(result.leads[place("O1")].marked, 0.25);
}

TEST_F(SignalBadLeads, StopsAtAQuarterAndSaysSo) {
  std::uint64_t seed = 20;
  for (const char* name : {"Fp1", "AF4", "F7", "FC1", "C3", "T8", "CP2", "P7", "Pz", "O2"})
    spoil(name, ++seed);
  const LeadCheck result = check();
  EXPECT_EQ(result.bad().size(), 8u);
  EXPECT_NE(result.note.find("8 of 32 leads"), std::string::npos) << result.note;
}

TEST_F(SignalBadLeads, WorksOnOneAverage) {
  spoil("C4");
  const LeadCheck result = check_leads(montage_, data_.leftCols(samples_), 1, {}, {});
  EXPECT_EQ(result.bad(), Labels{"C4"});
}

TEST_F(SignalBadLeads, LeadWithoutNeighboursHasNoCorrelation) {
  // Two patches, at the nose and at the back, with one lead far from both.
  const Labels names{"Fp1", "Fpz", "Fp2", "AF3", "AF4", "O1", "Oz", "O2", "PO3", "PO4", "T8"};
  const Montage sparse = standard_montage(names, 0.092);
  RandomStream random(1, "sparse");
  const Eigen::MatrixXd data = background(sparse, 10, 100, random);
  const LeadCheck result = check_leads(sparse, data, 10, {}, {});
  EXPECT_TRUE(std::isnan(result.leads.back().correlation));
  EXPECT_FALSE(std::isnan(result.leads.front().correlation));
}

TEST_F(SignalBadLeads, NothingAtAllMakesNoFigureThatIsNoNumber) {
  data_.setZero();
  for (const LeadFigures& lead : check().leads)
    EXPECT_TRUE(std::isfinite(lead.deviation) && std::isfinite(lead.spline_error) &&
                std::isfinite(lead.spline_z) && std::isfinite(lead.correlation));
}

TEST_F(SignalBadLeads, ListsEveryNameThatIsWrong) {
  BadLeadOptions options;
  options.bad = {"Fz", "Fpq"};
  options.good = {"Xy", "Fz"};
  try {
    check(options);
    FAIL();
  } catch (const InputError& error) {
    const std::string text = error.what();
    for (const char* part : {"'Fpq'", "'Xy'", "both bad and good"})
      EXPECT_NE(text.find(part), std::string::npos) << text;
  }
}

}  // namespace
}  // namespace headwater
