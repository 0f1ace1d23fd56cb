// Quantities as a person reads them: few digits, always a unit.
#pragma once

#include <optional>
#include <string>

namespace focusfall {

// "0.412 m", "4.12 m", "41.2 m", "412 m", "infinity".
std::string distance_text(double metres);

// "28.4 to 31.0 m", "12.3 m to infinity".
std::string distance_range_text(double low_m, double high_m);

// "8.2 px", "123 px".
std::string px_text(double px);

// "1/2000 s", "0.4 s", "30 s".
std::string time_text(double seconds);

// "f/2.8", "f/11".
std::string f_number_text(double f_number);

// "400 mm", "23.5 mm".
std::string millimetres_text(double mm);

// "12.9 um" with the micro sign.
std::string micrometres_text(double um);

// "0.4 %" of a fraction 0..1; "less than 0.1 %" above zero.
std::string percent_text(double fraction);

// Three significant digits without an exponent: "1980", "19.8", "0.198".
std::string plain_number(double value, int significant = 3);

}  // namespace focusfall
