// SPDX-License-Identifier: GPL-3.0-or-later
#include "error_words.hpp"
#include "trial_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/regression.hpp>

#include <gtest/gtest.h>

#include <stdexcept>

namespace headwater {
namespace {

class SignalRegressionFault : public testing::Test {
 protected:
  RandomStream random_{1, "regression fault"};
  Trials trials_ = noise_trials(random_, 1e-5 * random_.normal_matrix(5, 5), {20, 15}, 3, 0);
  Eigen::VectorXd values_ = random_.normal_matrix(35, 1).col(0);
  Regressor named(const std::string& name, const Eigen::VectorXd& values) {
    return {name, of_events(trials_, values)};
  }
};

TEST_F(SignalRegressionFault, AConstantRegressor) {
  expect_error<InputError>(
      [&] {
        regress(trials_,
                {named("good", values_), named("flat", Eigen::VectorXd::Constant(35, 0.1))}, {}, 0);
      },
      {"'flat'", "constant", "0.1"});
}

TEST_F(SignalRegressionFault, ARegressorThatIsTheCondition) {
  Eigen::VectorXd same(35);
  for (Eigen::Index k = 0; k < 35; ++k)
    same[k] = 1.1 + static_cast<double>(trials_.condition[static_cast<std::size_t>(k)]);
  expect_error<InputError>(
      [&] {
        regress(trials_, {named("same", same)}, {{}, true}, 0);
      },
      {"'same'", "constant within each condition"});
  EXPECT_EQ(regress(trials_, {named("same", same)}, {{}, false}, 0).names, Labels{"same"});
}

TEST_F(SignalRegressionFault, RegressorsThatMakeUpOneAnother) {
  const Eigen::VectorXd other = random_.normal_matrix(35, 1).col(0);
  // Rounded to six digits, as a table may hold it: still not to be told apart.
  Eigen::VectorXd sum = 1e3 * (2 * values_ - other).array() + 7;
  sum = (sum.array() * 1e3).round() / 1e3;
  for (const bool within : {true, false})
    expect_error<InputError>(
        [&] {
          regress(trials_, {named("a", values_), named("b", other), named("c", sum)}, {{}, within},
                  0);
        },
        {"linear combination", "a", "b", "c"});
}

TEST_F(SignalRegressionFault, TooFewTrials) {
  Eigen::VectorXd few = values_;
  few.tail(24).setConstant(std::nan(""));
  expect_error<InputError>([&] { regress(trials_, {named("few", few)}, {}, 0); },
                           {"11 trials", "3 columns", "13", "'few'", "24 of 35"});
}

TEST_F(SignalRegressionFault, UnknownConditionsAndInfiniteValues) {
  expect_error<InputError>(
      [&] {
        regress(trials_, {named("a", values_)}, {{"condition1", "rare"}, true}, 0);
      },
      {"rare"});
  Eigen::VectorXd infinite = values_;
  infinite[4] = -std::numeric_limits<double>::infinity();
  expect_error<InputError>([&] { regress(trials_, {named("a", infinite)}, {}, 0); },
                           {"'a'", "infinite", "row 12"});  // the fifth trial is event row 3 + 2*4
}

TEST_F(SignalRegressionFault, ARegressorThatVariesInOneBlockOnly) {
  Eigen::VectorXd once = Eigen::VectorXd::Zero(35);
  once.head(12) = values_.head(12);
  EXPECT_NO_THROW(regress(trials_, {named("once", once)}, {}, 5));
  once.tail(28).setZero();
  expect_error<InputError>([&] { regress(trials_, {named("once", once)}, {}, 5); },
                           {"trials 1 to 7", "block 1 of 5"});
}

TEST_F(SignalRegressionFault, WrongArguments) {
  EXPECT_THROW(regress(trials_, {}, {}, 0), ExperimentError);
  for (const int blocks : {-1, 1, 36})
    expect_error<ExperimentError>([&] { regress(trials_, {named("a", values_)}, {}, blocks); },
                                  {"blocks", "35"});
  EXPECT_THROW(regress(trials_, {{"short", values_}}, {}, 0), std::logic_error);
}

}  // namespace
}  // namespace headwater
