#include "src/output/quantity_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace focusfall {

std::string plain_number(double value, int significant) {
  if (!std::isfinite(value)) return value > 0 ? "infinity" : "-infinity";
  if (value == 0) return "0";
  const int magnitude = static_cast<int>(std::floor(std::log10(std::abs(value))));
  return fmt::format("{:.{}f}", value, std::clamp(significant - 1 - magnitude, 0, 12));
}

std::string distance_text(double metres) {
  return std::isinf(metres) ? "infinity" : plain_number(metres) + " m";
}

std::string distance_range_text(double low_m, double high_m) {
  if (std::isinf(high_m)) return distance_text(low_m) + " to infinity";
  // Both ends with the decimals that their difference needs: 29.4 to 30.6, 9.950 to 10.051.
  const double span = std::max(high_m - low_m, 1e-6);
  const int decimals = std::clamp(1 - static_cast<int>(std::floor(std::log10(span))), 0, 6);
  return fmt::format("{:.{}f} to {:.{}f} m", low_m, decimals, high_m, decimals);
}

std::string px_text(double px) { return fmt::format("{:.{}f} px", px, std::abs(px) < 99.95 ? 1 : 0); }

std::string time_text(double seconds) {
  // Cameras and photographers count in fractions below about a third of a second.
  if (seconds > 0 && seconds < 0.3) {
    const double inverse = 1 / seconds;
    return inverse < 9.95 ? fmt::format("1/{:.1f} s", inverse) : fmt::format("1/{:.0f} s", inverse);
  }
  return fmt::format("{:.3g} s", seconds);
}

std::string f_number_text(double f_number) {
  // Two significant digits as on the ring, three where the ring has them (f/1.25 of an exact value).
  const double tenth = std::round(f_number * 10) / 10;
  if (f_number >= 9.95) return fmt::format("f/{:.3g}", std::round(f_number * 10) / 10);
  return std::abs(tenth - f_number) < 0.005 ? fmt::format("f/{:.2g}", tenth) : fmt::format("f/{:.2f}", f_number);
}

std::string millimetres_text(double mm) { return fmt::format("{:.4g} mm", mm); }

std::string micrometres_text(double um) { return plain_number(um) + " \xC2\xB5m"; }

std::string percent_text(double fraction) {
  if (fraction <= 0) return "0 %";
  if (fraction < 0.001) return "less than 0.1 %";
  return fmt::format("{:.{}f} %", fraction * 100, fraction < 0.0995 ? 1 : 0);
}

}  // namespace focusfall
