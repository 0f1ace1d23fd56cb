#include "src/output/names.h"

namespace focusfall {
namespace {

constexpr Named<Source> kSources[] = {
    {Source::exif, "exif"},         {Source::maker_note, "maker note"}, {Source::xmp, "xmp"},
    {Source::raw, "raw"},           {Source::settings, "settings"},     {Source::user, "user"},
    {Source::derived, "derived"},   {Source::assumed, "assumed"},
};
constexpr Named<FocusAreaKind> kFocusAreaKinds[] = {
    {FocusAreaKind::user, "user"},
    {FocusAreaKind::focus_area, "focus area"},
    {FocusAreaKind::focus_region, "focus region"},
    {FocusAreaKind::face_region, "face region"},
    {FocusAreaKind::subject_area, "subject area"},
    {FocusAreaKind::centre, "centre"},
};
constexpr Named<FocusMode> kFocusModes[] = {
    {FocusMode::single, "single"}, {FocusMode::continuous, "continuous"}, {FocusMode::manual, "manual"}};
constexpr Named<ExposureMode> kExposureModes[] = {
    {ExposureMode::automatic, "automatic"}, {ExposureMode::manual, "manual"}, {ExposureMode::bracket, "bracket"}};
constexpr Named<DistanceOrigin> kDistanceOrigins[] = {{DistanceOrigin::sensor, "sensor"},
                                                      {DistanceOrigin::lens, "lens"}};
constexpr Named<Bound> kBounds[] = {{Bound::none, "none"}, {Bound::lower, "lower"}, {Bound::upper, "upper"}};
constexpr Named<Contact> kContacts[] = {
    {Contact::none, "none"}, {Contact::aim, "aim"}, {Contact::foot, "foot"}};
constexpr Named<NearSide> kNearSides[] = {{NearSide::bottom, "bottom"},
                                          {NearSide::top, "top"},
                                          {NearSide::left, "left"},
                                          {NearSide::right, "right"}};
constexpr Named<ClippedKind> kClippedKinds[] = {{ClippedKind::none, "none"},
                                                {ClippedKind::points, "points"},
                                                {ClippedKind::area, "area"},
                                                {ClippedKind::colour, "colour"}};
constexpr Named<ClippedOn> kClippedOn[] = {{ClippedOn::picture, "picture"}, {ClippedOn::mosaic, "mosaic"}};
constexpr Named<FocusVerdict> kFocusVerdicts[] = {
    {FocusVerdict::on, "on"},   {FocusVerdict::front, "front"},   {FocusVerdict::back, "back"},
    {FocusVerdict::off, "off"}, {FocusVerdict::unsure, "unsure"}, {FocusVerdict::no_evidence, "no evidence"}};
constexpr Named<Cause> kCauses[] = {
    {Cause::defocus, "defocus"},
    {Cause::subject_motion, "subject motion"},
    {Cause::camera_shake, "camera shake"},
    {Cause::motion, "motion"},
    {Cause::diffraction, "diffraction"},
    {Cause::shallow_depth_of_field, "shallow depth of field"},
    {Cause::missed_aim, "missed aim"}};
constexpr Named<ExposureVerdict> kExposureVerdicts[] = {{ExposureVerdict::as_predicted, "as predicted"},
                                                        {ExposureVerdict::over, "over"},
                                                        {ExposureVerdict::under, "under"},
                                                        {ExposureVerdict::unknown, "unknown"}};
constexpr Named<Stage> kStages[] = {
    {Stage::find, "find"},       {Stage::read, "read"},       {Stage::resolve, "resolve"},
    {Stage::decode, "decode"},   {Stage::predict, "predict"}, {Stage::measure, "measure"},
    {Stage::compare, "compare"}};
constexpr const char* kBaselineSources[] = {"prior", "settings", "learned"};

}  // namespace

template <> std::span<const Named<Source>> names_of<Source>() { return kSources; }
template <> std::span<const Named<FocusAreaKind>> names_of<FocusAreaKind>() { return kFocusAreaKinds; }
template <> std::span<const Named<FocusMode>> names_of<FocusMode>() { return kFocusModes; }
template <> std::span<const Named<ExposureMode>> names_of<ExposureMode>() { return kExposureModes; }
template <> std::span<const Named<DistanceOrigin>> names_of<DistanceOrigin>() { return kDistanceOrigins; }
template <> std::span<const Named<Bound>> names_of<Bound>() { return kBounds; }
template <> std::span<const Named<Contact>> names_of<Contact>() { return kContacts; }
template <> std::span<const Named<NearSide>> names_of<NearSide>() { return kNearSides; }
template <> std::span<const Named<ClippedKind>> names_of<ClippedKind>() { return kClippedKinds; }
template <> std::span<const Named<ClippedOn>> names_of<ClippedOn>() { return kClippedOn; }
template <> std::span<const Named<FocusVerdict>> names_of<FocusVerdict>() { return kFocusVerdicts; }
template <> std::span<const Named<Cause>> names_of<Cause>() { return kCauses; }
template <> std::span<const Named<ExposureVerdict>> names_of<ExposureVerdict>() { return kExposureVerdicts; }
template <> std::span<const Named<Stage>> names_of<Stage>() { return kStages; }

std::span<const char* const> baseline_source_names() { return kBaselineSources; }

}  // namespace focusfall
