#include "src/pipeline/clock.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <system_error>

namespace focusfall {

std::optional<std::string> moved_time(const std::string& iso_time, double seconds) {
  int year = 0, month = 0, day = 0, hour = 0, minute = 0, second = 0, length = 0;
  if (std::sscanf(iso_time.c_str(), "%4d-%2d-%2dT%2d:%2d:%2d%n", &year, &month, &day, &hour, &minute, &second,
                  &length) != 6) {
    return std::nullopt;
  }
  const std::chrono::year_month_day date{std::chrono::year{year}, std::chrono::month{static_cast<unsigned>(month)},
                                         std::chrono::day{static_cast<unsigned>(day)}};
  if (!date.ok() || hour > 23 || minute > 59 || second > 60) return std::nullopt;

  // The fraction of a second counts in units of its own last digit.
  std::size_t end = static_cast<std::size_t>(length);
  std::string digits;
  if (end < iso_time.size() && iso_time[end] == '.') {
    const auto after = iso_time.find_first_not_of("0123456789", end + 1);
    digits = iso_time.substr(end + 1, after == std::string::npos ? after : after - end - 1);
    end = after == std::string::npos ? iso_time.size() : after;
  }
  if (digits.size() > 6) digits.resize(6);
  const auto per_second = static_cast<long long>(std::llround(std::pow(10.0, static_cast<double>(digits.size()))));
  const long long fraction = digits.empty() ? 0 : std::stoll(digits);

  const auto days = std::chrono::sys_days{date}.time_since_epoch().count();
  long long ticks = ((days * 24LL + hour) * 60 + minute) * 60 + second;
  ticks = ticks * per_second + fraction + std::llround(seconds * static_cast<double>(per_second));

  // Floor division: times before 1970 are times too.
  long long whole = ticks / per_second, rest = ticks % per_second;
  if (rest < 0) rest += per_second, --whole;
  const std::chrono::sys_seconds moved{std::chrono::seconds{whole}};
  const auto midnight = std::chrono::floor<std::chrono::days>(moved);
  const std::chrono::year_month_day moved_date{midnight};
  const std::chrono::hh_mm_ss clock{moved - midnight};
  std::string text = fmt::format("{:04}-{:02}-{:02}T{:02}:{:02}:{:02}", static_cast<int>(moved_date.year()),
                                 static_cast<unsigned>(moved_date.month()), static_cast<unsigned>(moved_date.day()),
                                 clock.hours().count(), clock.minutes().count(), clock.seconds().count());
  if (!digits.empty()) text += fmt::format(".{:0{}}", rest, digits.size());
  return text + iso_time.substr(end);
}

std::optional<double> seconds_of_time(const std::string& iso_time) {
  int year = 0, month = 0, day = 0, hour = 0, minute = 0, length = 0;
  if (std::sscanf(iso_time.c_str(), "%4d-%2d-%2dT%2d:%2d:%n", &year, &month, &day, &hour, &minute, &length) != 5 ||
      length == 0) {
    return std::nullopt;
  }
  const std::chrono::year_month_day date{std::chrono::year{year}, std::chrono::month{static_cast<unsigned>(month)},
                                         std::chrono::day{static_cast<unsigned>(day)}};
  const std::size_t zone_at = std::min(iso_time.find_first_of("Z+-", static_cast<std::size_t>(length)), iso_time.size());
  double second = 0;
  const char* begin = iso_time.data() + length;
  const auto [end, error] = std::from_chars(begin, iso_time.data() + zone_at, second);
  if (!date.ok() || hour > 23 || minute > 59 || error != std::errc() || !(second >= 0 && second < 61)) return std::nullopt;

  int zone_hours = 0, zone_minutes = 0;
  char sign = '+';
  if (zone_at < iso_time.size() && iso_time[zone_at] != 'Z' &&
      std::sscanf(iso_time.c_str() + zone_at, "%c%2d:%2d", &sign, &zone_hours, &zone_minutes) < 2) {
    return std::nullopt;
  }
  const double zone_s = (sign == '-' ? -1 : 1) * 60.0 * (60 * zone_hours + zone_minutes);
  const auto days = static_cast<double>(std::chrono::sys_days{date}.time_since_epoch().count());
  return ((days * 24 + hour) * 60 + minute) * 60 + second - zone_s;
}

}  // namespace focusfall
