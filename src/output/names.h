// How each enumerated value is spelled in JSON, CSV and text. One table per type; the schema repeats them, and a test
// compares the two.
#pragma once

#include <optional>
#include <span>
#include <string_view>

#include "analysis/compare/verdict.h"
#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"
#include "metadata/capture.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

template <class Enum>
struct Named {
  Enum value;
  const char* name;
};

// All values of a type with their names. Specialised for each type in names.cpp.
template <class Enum>
std::span<const Named<Enum>> names_of();

template <> std::span<const Named<Source>> names_of<Source>();
template <> std::span<const Named<FocusAreaKind>> names_of<FocusAreaKind>();
template <> std::span<const Named<FocusMode>> names_of<FocusMode>();
template <> std::span<const Named<ExposureMode>> names_of<ExposureMode>();
template <> std::span<const Named<DistanceOrigin>> names_of<DistanceOrigin>();
template <> std::span<const Named<Bound>> names_of<Bound>();
template <> std::span<const Named<Contact>> names_of<Contact>();
template <> std::span<const Named<NearSide>> names_of<NearSide>();
template <> std::span<const Named<ClippedKind>> names_of<ClippedKind>();
template <> std::span<const Named<ClippedOn>> names_of<ClippedOn>();
template <> std::span<const Named<FocusVerdict>> names_of<FocusVerdict>();
template <> std::span<const Named<Cause>> names_of<Cause>();
template <> std::span<const Named<ExposureVerdict>> names_of<ExposureVerdict>();
template <> std::span<const Named<Stage>> names_of<Stage>();

// "prior", "settings", "learned": Prediction::baseline_source points at one of these.
std::span<const char* const> baseline_source_names();

template <class Enum>
const char* name_of(Enum value) {
  for (const auto& entry : names_of<Enum>()) {
    if (entry.value == value) return entry.name;
  }
  return "";
}

template <class Enum>
std::optional<Enum> value_named(std::string_view name) {
  for (const auto& entry : names_of<Enum>()) {
    if (name == entry.name) return entry.value;
  }
  return std::nullopt;
}

}  // namespace focusfall
