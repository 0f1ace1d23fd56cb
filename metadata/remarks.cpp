#include "metadata/remarks.h"

#include <fmt/format.h>
#include <cmath>

namespace focusfall {

std::optional<double> plausible(double value, const Plausible& limits, Remarks& remarks) {
  if (value >= limits.least && value <= limits.greatest) return value;
  remark_absurd(limits.name, fmt::format("{:.6g}{}", value, limits.unit),
                fmt::format("{:g} to {:g}{}", limits.least, limits.greatest, limits.unit), remarks);
  return std::nullopt;
}

void remark_absurd(const char* name, const std::string& seen_text, const std::string& expected, Remarks& remarks) {
  // Damaged files hold texts of any length; the start tells what they are.
  constexpr std::size_t kMostShown = 60;
  const std::string seen = seen_text.size() <= kMostShown ? seen_text : seen_text.substr(0, kMostShown) + "...";
  remarks.push_back({kValueAbsurd, fmt::format("The file gives {} as {}; expected {}. It is taken as not known.", name,
                                               seen, expected)});
}

}  // namespace focusfall
