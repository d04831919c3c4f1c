// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/base/labels.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

const Labels kLeads{"Fp1", "Fz", "Cz", "CPz", "T7"};

TEST(BaseLabels, FindsExactAndAnyCase) {
  EXPECT_EQ(find_label(kLeads, "CPz"), 3);
  EXPECT_FALSE(find_label(kLeads, "CPZ"));
  EXPECT_EQ(find_label_any_case(kLeads, "CPZ"), 3);
  EXPECT_FALSE(find_label_any_case(kLeads, "CP"));
}

TEST(BaseLabels, MatchesByNameAndListsEveryMissingName) {
  EXPECT_EQ(match_labels({"T7", "Fp1"}, kLeads, "table"), (std::vector<Eigen::Index>{4, 0}));
  try {
    match_labels({"T7", "Oz", "P3"}, kLeads, "average.tsv");
    FAIL() << "two labels are missing";
  } catch (const InputError& error) {
    const std::string text = error.what();
    EXPECT_NE(text.find("average.tsv"), std::string::npos) << text;
    EXPECT_NE(text.find("Oz and P3"), std::string::npos) << text;
  }
}

TEST(BaseLabels, ListsRepeatsOnceWhateverTheCase) {
  EXPECT_EQ(repeated_labels({"Cz", "CZ", "Pz", "cz"}), Labels{"CZ"});
  EXPECT_TRUE(repeated_labels(kLeads).empty());
}

TEST(BaseLabels, SuggestsOnlyWhatMayBeASlip) {
  const Labels keys{"averages", "baseline_ms", "regularisation", "Cz"};
  EXPECT_EQ(nearest_label("avergaes", keys), "averages");
  EXPECT_EQ(nearest_label("regularization", keys), "regularisation");
  EXPECT_EQ(nearest_label("CZ", keys), "Cz");
  EXPECT_EQ(nearest_label("montage", keys), "");
  EXPECT_EQ(nearest_label("x", {"y"}), "");  // another letter is another name
  EXPECT_EQ(did_you_mean("baselin_ms", keys), " Did you mean 'baseline_ms'?");
  EXPECT_EQ(did_you_mean("montage", keys), "");
}

TEST(BaseLabels, MakesFileLabels) {
  EXPECT_EQ(file_label("late minus steady"), "lateMinusSteady");
  EXPECT_EQ(file_label("minimum-norm"), "minimumNorm");
  EXPECT_EQ(file_label("  P1 (object) "), "P1Object");
  EXPECT_EQ(file_label("sp\xc3\xa4te Schl\xc3\xa4ge"), "spteSchlge");
  EXPECT_EQ(file_label("\xe6\x97\xa9").size(), 9u);  // no ASCII letter: a hash, never an empty name
  EXPECT_NE(file_label("\xe6\x97\xa9"), file_label("\xe6\x99\x9a"));
}

TEST(BaseLabels, JoinsInWords) {
  EXPECT_EQ(join_labels({}), "");
  EXPECT_EQ(join_labels({"a"}), "a");
  EXPECT_EQ(join_labels({"a", "b", "c"}), "a, b and c");
}

}  // namespace
}  // namespace headwater
