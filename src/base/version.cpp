// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/version.hpp>

namespace headwater {

std::string version() {
  return HEADWATER_VERSION;
}

std::string caution() {
  return "For research only. Headwater is not a medical device: do not use it for diagnosis, nor "
         "to plan "
         "surgery or stimulation.\nIt works on a template head with spherical shells: read "
         "positions in "
         "centimetres, not millimetres.";
}

}  // namespace headwater
