#include "src/output/overlay.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <functional>
#include <numbers>
#include <opencv2/imgproc.hpp>
#include <optional>
#include <utility>
#include <vector>

#include "analysis/compare/compare.h"
#include "analysis/measure/plane.h"
#include "src/output/contours.h"
#include "src/output/overlay_legend.h"
#include "src/output/quantity_text.h"
#include "src/output/sheet.h"
#include "src/pipeline/resolve.h"

namespace focusfall {
namespace {

constexpr double kLightened = 0.36;                  // of the picture, so that black lines stand out (judgement)
constexpr int kLeastSheetWidthPx = 1100;             // for three columns of legend
constexpr int kLeastSheetHeightPx = 620;             // for one column of it
constexpr Lettering kTag{.size_px = 15, .bold = true, .casing = true};
constexpr Lettering kContourNumber{.size_px = 13, .casing = true};

bool upright(const OverlayPicture& picture) { return picture.grey.rows > picture.grey.cols; }

// Where a x + b y = c crosses the unit square.
std::optional<std::pair<FramePoint, FramePoint>> line_across_frame(double a, double b, double c) {
  std::vector<FramePoint> ends;
  const auto inside = [](double t) { return t >= 0 && t <= 1; };
  for (const double x : {0.0, 1.0}) {
    if (b != 0 && inside((c - a * x) / b)) ends.push_back({x, (c - a * x) / b});
  }
  for (const double y : {0.0, 1.0}) {
    if (a != 0 && inside((c - b * y) / a)) ends.push_back({(c - b * y) / a, y});
  }
  // A line through a corner meets two sides at one point.
  for (std::size_t i = 1; i < ends.size(); ++i) {
    if (std::hypot(ends[i].x - ends[0].x, ends[i].y - ends[0].y) > 1e-9) return {{ends[0], ends[i]}};
  }
  return std::nullopt;
}

class Overlay {
 public:
  Overlay(const FrameRecord& record, const OverlayPicture& picture, Sheet& sheet, const SheetBox& area)
      : record_(record), m_(*record.measurement), picture_(picture), sheet_(sheet), area_(area),
        orientation_(record.capture && record.capture->orientation ? record.capture->orientation->value : 1) {}

  void draw() {
    sheet_.clip(area_);
    sheet_.picture(picture_.grey, {area_.x, area_.y}, kLightened);
    draw_clipped();
    const SheetBox aim = box_of(m_.aim.box);
    reserve_tag(aim);
    draw_contours();
    draw_plane();
    draw_boxes(aim);
    draw_motion(aim);
    letter_clipped();
    sheet_.unclip();
    sheet_.box(area_, {.width_px = 1, .casing_px = 0});
  }

 private:
  SheetPoint place(FramePoint unrotated) const {
    const FramePoint p = displayed_point(unrotated, orientation_);
    return {area_.x + p.x * area_.width, area_.y + p.y * area_.height};
  }

  SheetBox box_of(const FractionBox& box) const {
    const SheetPoint a = place({box.x, box.y}), b = place({box.x + box.width, box.y + box.height});
    return {std::min(a.x, b.x), std::min(a.y, b.y), std::abs(a.x - b.x), std::abs(a.y - b.y)};
  }

  // Whether a label fits: inside the picture and clear of the others.
  bool is_free(const SheetBox& box) const {
    if (box.x < area_.x + 2 || box.y < area_.y + 2 || box.x + box.width > area_.x + area_.width - 2 ||
        box.y + box.height > area_.y + area_.height - 2) {
      return false;
    }
    return std::ranges::none_of(taken_, [&box](const SheetBox& other) {
      return box.x < other.x + other.width && other.x < box.x + box.width && box.y < other.y + other.height &&
             other.y < box.y + box.height;
    });
  }

  // Writes `words` centred there unless the place is taken.
  bool label(const std::string& words, SheetPoint centre, const Lettering& lettering) {
    const double width = sheet_.text_width_px(words, lettering);
    const SheetBox box{centre.x - width / 2 - 3, centre.y - lettering.size_px * 0.7, width + 6,
                       lettering.size_px * 1.4};
    if (!is_free(box)) return false;
    taken_.push_back(box);
    sheet_.text(words, {centre.x - width / 2, centre.y + lettering.size_px * 0.36}, lettering);
    return true;
  }

  // ---- clipped parts ----

  void draw_clipped() {
    cv::Mat any;
    cv::max(picture_.clipped[0], picture_.clipped[1], any);
    cv::max(any, picture_.clipped[2], any);
    if (cv::countNonZero(any) == 0) return;
    // Gaps of a few pixels inside a patch are closed for the eye; the figures in the legend are exact.
    constexpr int kClosedPx = 9;
    cv::morphologyEx(any, any, cv::MORPH_CLOSE,
                     cv::getStructuringElement(cv::MORPH_ELLIPSE, {kClosedPx, kClosedPx}));
    sheet_.hatch(any, {area_.x, area_.y});
  }

  // The letters of the clipped channels, in the largest patches of the same channels.
  void letter_clipped() {
    constexpr std::array<const char*, 8> kLetters{"", "R", "G", "RG", "B", "RB", "GB", "RGB"};
    constexpr int kLeastLetteredPx = 500;           // judgement: a letter does not hide the patch
    constexpr std::size_t kMostLettered = 8;
    struct Patch {
      int area_px = 0;
      const char* letters = "";
      SheetPoint at;
    };
    const cv::Mat channels = (picture_.clipped[0] & 1) | (picture_.clipped[1] & 2) | (picture_.clipped[2] & 4);
    std::vector<Patch> patches;
    for (std::size_t code = 1; code < kLetters.size(); ++code) {
      cv::Mat labels, stats, centroids;
      const int count = cv::connectedComponentsWithStats(channels == static_cast<double>(code), labels, stats,
                                                         centroids, 8, CV_32S);
      for (int i = 1; i < count; ++i) {
        const int area_px = stats.at<int>(i, cv::CC_STAT_AREA);
        if (area_px >= kLeastLetteredPx) patches.push_back({area_px, kLetters[code], inner_point(labels == i)});
      }
    }
    std::ranges::stable_sort(patches, std::greater{}, &Patch::area_px);
    if (patches.size() > kMostLettered) patches.resize(kMostLettered);
    for (const Patch& patch : patches) label(patch.letters, patch.at, kTag);
  }

  // The point of a patch farthest from its border.
  SheetPoint inner_point(const cv::Mat& patch) const {
    cv::Mat distance;
    cv::distanceTransform(patch, distance, cv::DIST_L2, 3);
    cv::Point at;
    cv::minMaxLoc(distance, nullptr, nullptr, nullptr, &at);
    return {area_.x + at.x, area_.y + at.y};
  }

  // ---- blur ----

  void draw_contours() {
    if (!m_.tiles) return;
    const Prediction prediction = record_.prediction.value_or(Prediction{});
    constexpr std::size_t kLevels = 6;
    std::array<double, kLevels> levels{};
    for (std::size_t i = 0; i < kLevels; ++i) levels[i] = acceptable_blur_px(prediction) * std::exp2(i);
    const ContourRequest request{
        .frame = {record_.capture->width_px.value_or(1), record_.capture->height_px.value_or(1)},
        .baseline_px2 = prediction.baseline_px2 ? prediction.baseline_px2->value : 0,
        .levels_px = levels};
    std::vector<std::pair<double, std::vector<SheetPoint>>> lines;
    for (const Contour& contour : blur_contours(*m_.tiles, request)) {
      std::vector<SheetPoint> points;
      for (const FramePoint& point : contour.points) points.push_back(place(point));
      if (is_scrap(points)) continue;
      lines.emplace_back(contour.blur_disc_px, std::move(points));
    }
    for (const auto& [level, points] : lines) {
      sheet_.line(points, level == levels[0] ? kAcceptableContour : kContour);
    }
    for (const auto& [level, points] : lines) number_contour(level, points);
  }

  // An open line no longer than a tile comes of one tile's noise.
  bool is_scrap(const std::vector<SheetPoint>& points) const {
    double length = 0;
    for (std::size_t i = 1; i < points.size(); ++i) {
      length += std::hypot(points[i].x - points[i - 1].x, points[i].y - points[i - 1].y);
    }
    const double long_side_px = std::max(record_.capture->width_px.value_or(1), record_.capture->height_px.value_or(1));
    return length < 1.2 * m_.tiles->tile_px / long_side_px * std::max(area_.width, area_.height);
  }

  // A number about every four hundred pixels of a line, where there is room.
  void number_contour(double level, const std::vector<SheetPoint>& points) {
    constexpr double kFirstPx = 60, kEveryPx = 400;
    double walked = 0, next = kFirstPx;
    for (std::size_t i = 1; i < points.size(); ++i) {
      walked += std::hypot(points[i].x - points[i - 1].x, points[i].y - points[i - 1].y);
      if (walked >= next && label(fmt::format("{:.2g}", level), points[i], kContourNumber)) next = walked + kEveryPx;
    }
  }

  // ---- where focus fell ----

  void draw_plane() {
    if (!m_.plane) return;
    const PlaneReading& plane = *m_.plane;
    const double limit = acceptable_blur_px(record_.prediction.value_or(Prediction{}));
    const auto at_blur = [&plane](double blur_px) {
      return line_across_frame(plane.x_gradient_px, plane.y_gradient_px, blur_px - plane.offset_px);
    };
    for (const double side : {-1.0, 1.0}) {
      if (const auto ends = at_blur(side * limit)) {
        const SheetPoint line[] = {place(ends->first), place(ends->second)};
        sheet_.line(line, kLimitLine);
      }
    }
    if (const auto ends = at_blur(0)) {
      const SheetPoint line[] = {place(ends->first), place(ends->second)};
      sheet_.line(line, kFocusLine);
      name_sides(plane, line[0], line[1]);
    }
    if (plane.contact != Contact::none) draw_contact(plane);
  }

  // "+ focus fell behind" on the side where the signed blur is positive, "- focus fell in front" on the other.
  void name_sides(const PlaneReading& plane, SheetPoint a, SheetPoint b) {
    const SheetPoint up = direction(plane.x_gradient_px * area_.height, plane.y_gradient_px * area_.width);
    if (a.x > b.x) std::swap(a, b);
    constexpr double kAwayPx = 20;
    for (const double share : {0.12, 0.85, 0.5, 0.3, 0.7}) {
      const SheetPoint p{a.x + share * (b.x - a.x), a.y + share * (b.y - a.y)};
      const bool plus = label("+ focus fell behind", {p.x + up.x * kAwayPx, p.y + up.y * kAwayPx}, kTag);
      const bool minus =
          label("\xE2\x88\x92 focus fell in front", {p.x - up.x * kAwayPx, p.y - up.y * kAwayPx}, kTag);
      if (plus || minus) return;
    }
  }

  void draw_contact(const PlaneReading& plane) {
    const SheetPoint at = place({plane.contact_x, plane.contact_y});
    constexpr double kArmPx = 9;
    const SheetPoint rising[] = {{at.x - kArmPx, at.y + kArmPx}, {at.x + kArmPx, at.y - kArmPx}};
    const SheetPoint falling[] = {{at.x - kArmPx, at.y - kArmPx}, {at.x + kArmPx, at.y + kArmPx}};
    sheet_.line(rising, kArrow);
    sheet_.line(falling, kArrow);
    if (!plane.at_contact_px) return;
    const double blur_px = plane.at_contact_px->value;
    const std::string words = fmt::format("{}{:.1f} px", blur_px < 0 ? "\xE2\x88\x92" : "+", std::abs(blur_px));
    label(words, {at.x + 48, at.y}, kTag) || label(words, {at.x - 48, at.y}, kTag) ||
        label(words, {at.x, at.y + 24}, kTag);
  }

  // ---- aim, sharpest part, motion ----

  std::string aim_tag() const {
    if (!m_.aim_blur.estimate) return "aim";
    const Interval s = blur_after_baseline(*m_.aim_blur.estimate, record_.prediction.value_or(Prediction{}), m_);
    return "aim " + px_text(blur_disc_px(s.value));
  }

  SheetPoint aim_tag_place(const SheetBox& aim) const {
    const bool above = aim.y - area_.y > 24;
    return {aim.x, above ? aim.y - 8 : aim.y + aim.height + 20};
  }

  // Keeps contour numbers off the aim's tag, which is drawn last.
  void reserve_tag(const SheetBox& aim) {
    const SheetPoint at = aim_tag_place(aim);
    taken_.push_back({at.x - 2, at.y - 16, sheet_.text_width_px(aim_tag(), kTag) + 4, 20});
  }

  void draw_boxes(const SheetBox& aim) {
    if (m_.best && m_.best->reading.estimate) sheet_.box(box_of(m_.best->box), kBestBox);
    sheet_.box(aim, kAimBox);
    sheet_.text(aim_tag(), aim_tag_place(aim), kTag);
  }

  // A unit vector of the sheet for one in pixels of the unrotated frame.
  SheetPoint direction(double x, double y) const {
    const FramePoint zero = displayed_point({0, 0}, orientation_), to = displayed_point({x, y}, orientation_);
    const SheetPoint step{to.x - zero.x, to.y - zero.y};
    const double length = std::hypot(step.x, step.y);
    return length > 0 ? SheetPoint{step.x / length, step.y / length} : SheetPoint{1, 0};
  }

  void draw_motion(const SheetBox& aim) {
    constexpr double kHalfPx = 34;
    const auto draw = [this](const MotionReading& motion, SheetPoint centre) {
      const double angle = motion.angle_deg * std::numbers::pi / 180;
      const SheetPoint along = direction(std::cos(angle), std::sin(angle));
      sheet_.arrow(centre, {along.x * kHalfPx, along.y * kHalfPx}, kArrow);
    };
    // In the aim's upper right corner: its middle is the subject, and may hold the contact.
    if (motion_is_told(m_.motion)) draw(*m_.motion, {aim.x + aim.width - kHalfPx - 8, aim.y + kHalfPx + 8});
    if (motion_is_told(m_.background_motion)) {
      const SheetPoint corner{area_.x + area_.width - 62, area_.y + 46};
      draw(*m_.background_motion, corner);
      const std::string words = "background " + px_text(m_.background_motion->length_px);
      label(words, {corner.x - 26, corner.y + 46}, kTag) || label(words, {corner.x - 120, corner.y}, kTag) ||
          label(words, {corner.x - 26, corner.y + 74}, kTag);
    }
  }

  const FrameRecord& record_;
  const Measurement& m_;
  const OverlayPicture& picture_;
  Sheet& sheet_;
  SheetBox area_;
  int orientation_;
  std::vector<SheetBox> taken_;
};

}  // namespace

LargestSize overlay_picture_room(bool upright) {
  if (upright) return {kOverlayLongSidePx - kLegendWidthPx, kOverlayLongSidePx};
  return {kOverlayLongSidePx, kOverlayLongSidePx - kLegendHeightPx};
}

std::string overlay_png(const FrameRecord& record, const OverlayPicture& picture) {
  const int width = picture.grey.cols, height = picture.grey.rows;
  const bool stands = upright(picture);
  const int sheet_width = stands ? width + kLegendWidthPx : std::max(width, kLeastSheetWidthPx);
  const int sheet_height = stands ? std::max(height, kLeastSheetHeightPx) : height + kLegendHeightPx;
  Sheet sheet(sheet_width, sheet_height);
  const SheetBox area{stands ? 0.0 : std::floor((sheet_width - width) / 2.0), 0, static_cast<double>(width),
                      static_cast<double>(height)};
  Overlay(record, picture, sheet, area).draw();
  const SheetBox legend =
      stands ? SheetBox{static_cast<double>(width), 0, kLegendWidthPx, static_cast<double>(sheet_height)}
             : SheetBox{0, static_cast<double>(height), static_cast<double>(sheet_width), kLegendHeightPx};
  draw_legend(sheet, legend, record);
  return sheet.png(kOverlayMark);
}

}  // namespace focusfall
