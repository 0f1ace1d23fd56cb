#include "src/output/page.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <optional>
#include <utility>

#include "src/output/base64.h"
#include "src/output/page_assets.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

// Tiles on the page: a landscape frame of 3:2 in squares. Fine enough for contours, small enough for 3,000 frames.
constexpr int kLongSideTiles = 24;
constexpr int kShortSideTiles = 16;

// Blur as one octet: 1 + 40 log2(1 + px), so that steps are 1.7 % of (1 + px) and 255 stands for 80 px. 0: no evidence.
constexpr double kOctetsPerDoubling = 40;
std::uint8_t blur_octet(double blur_px) {
  return static_cast<std::uint8_t>(std::clamp(1 + std::lround(kOctetsPerDoubling * std::log2(1 + blur_px)), 1L, 255L));
}

// Any clipping at all stays visible: rounded up.
std::uint8_t share_octet(double share) {
  return static_cast<std::uint8_t>(std::clamp(std::ceil(share * 255), 0.0, 255.0));
}

// The mean of those values of a block that are there.
std::optional<double> block_mean(const Json& values, int stride, int x0, int x1, int y0, int y1) {
  double sum = 0;
  int count = 0;
  for (int y = y0; y < y1; ++y) {
    for (int x = x0; x < x1; ++x) {
      const Json& value = values.at(static_cast<std::size_t>(y) * static_cast<std::size_t>(stride) +
                                    static_cast<std::size_t>(x));
      if (!value.is_number()) continue;
      sum += value.get<double>();
      ++count;
    }
  }
  return count > 0 ? std::optional(sum / count) : std::nullopt;
}

Json thinned_tiles(const Json& tiles) {
  const int rows = tiles.at("rows").get<int>(), columns = tiles.at("columns").get<int>();
  const Json& blur = tiles.at("blur_disc_px");
  const Json& clipped = tiles.at("clipped");
  const std::size_t count = static_cast<std::size_t>(std::max(rows, 0)) * static_cast<std::size_t>(std::max(columns, 0));
  if (count == 0 || blur.size() != count || clipped.size() != count) return nullptr;
  const bool wide = columns >= rows;
  const int out_columns = std::min(columns, wide ? kLongSideTiles : kShortSideTiles);
  const int out_rows = std::min(rows, wide ? kShortSideTiles : kLongSideTiles);
  std::string blur_octets, clipped_octets;
  for (int row = 0; row < out_rows; ++row) {
    const int y0 = row * rows / out_rows, y1 = (row + 1) * rows / out_rows;
    for (int column = 0; column < out_columns; ++column) {
      const int x0 = column * columns / out_columns, x1 = (column + 1) * columns / out_columns;
      const auto blur_px = block_mean(blur, columns, x0, x1, y0, y1);
      blur_octets += static_cast<char>(blur_px ? blur_octet(*blur_px) : 0);
      clipped_octets += static_cast<char>(share_octet(block_mean(clipped, columns, x0, x1, y0, y1).value_or(0)));
    }
  }
  return {{"rows", out_rows},
          {"columns", out_columns},
          {"blur", base64(blur_octets)},
          {"clipped", base64(clipped_octets)}};
}

void drop_absent(Json& json) {
  if (json.is_object()) {
    for (auto item = json.begin(); item != json.end();) {
      if (item->is_null()) {
        item = json.erase(item);
      } else {
        drop_absent(*item);
        ++item;
      }
    }
  } else if (json.is_array()) {
    for (Json& item : json) drop_absent(item);
  }
}

// In JSON a "<" occurs only in strings, where \u003c is the same character: no string can end the element it stands in.
std::string inert_json(const Json& json) {
  const std::string text = json.dump(-1, ' ', false, Json::error_handler_t::replace);
  std::string result;
  result.reserve(text.size());
  for (const char c : text) {
    if (c == '<') {
      result += "\\u003c";
    } else {
      result += c;
    }
  }
  return result;
}

std::string policy(const PageOptions& options) {
  const PageAssets& assets = page_assets();
  return fmt::format(
      "default-src 'none'; script-src '{}'; style-src '{}'; img-src {}; connect-src {}; base-uri 'none'; "
      "form-action 'none'",
      assets.script_hash, assets.style_hash, options.image_source, options.connect_source);
}

}  // namespace

bool page_is_built() { return !page_assets().script.empty(); }

Json page_record(Json record) {
  if (auto measurement = record.find("measurement"); measurement != record.end() && measurement->is_object()) {
    if (auto tiles = measurement->find("tiles"); tiles != measurement->end()) {
      if (tiles->is_object()) record["tiles"] = thinned_tiles(*tiles);
      record["measurement"].erase("tiles");
    }
  }
  record.erase("schema");
  drop_absent(record);
  return record;
}

std::string page_html(const std::vector<PageFrame>& frames, const PageOptions& options) {
  Json data = options.more.is_object() ? options.more : Json::object();
  data["title"] = options.title;
  data["version"] = options.version;
  Json records = Json::array();
  std::string pictures;
  for (const PageFrame& frame : frames) {
    records.push_back(page_record(frame.record));
    pictures += base64(frame.pictures.whole) + "," + base64(frame.pictures.aim) + "\n";
  }
  data["frames"] = std::move(records);

  const PageAssets& assets = page_assets();
  std::string html = kPageStart;
  html += "<head>\n<meta charset=\"utf-8\">\n";
  html += "<meta http-equiv=\"Content-Security-Policy\" content=\"" + policy(options) + "\">\n";
  html += "<meta name=\"referrer\" content=\"no-referrer\">\n";
  html += "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n<title>Focusfall</title>\n";
  html.append("<style>").append(assets.style).append("</style>\n");
  html.append("<script type=\"application/json\" id=\"data\">").append(inert_json(data)).append("</script>\n");
  html.append("<script type=\"text/plain\" id=\"pictures\">").append(pictures).append("</script>\n</head>\n");
  html += "<body>\n<noscript>This page is drawn by a script that it carries; the browser was told to run none.</noscript>\n";
  html.append("<script>").append(assets.script).append("</script>\n</body>\n</html>\n");
  return html;
}

}  // namespace focusfall
