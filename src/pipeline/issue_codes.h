// Every code that an Issue may carry: the one table. The JSON Schema of the frame record repeats it; a test compares
// the two, and another looks through the sources for codes that do not stand here.
#pragma once

#include <string_view>

namespace focusfall {

struct IssueCode {
  std::string_view code;
  std::string_view meaning;
};

inline constexpr IssueCode kIssueCodes[] = {
    // The file could not be read.
    {"file-missing", "there is no such file"},
    {"file-unreadable", "the file cannot be opened or read"},
    {"file-too-large", "larger than any photograph that is read"},
    {"file-empty", "the file holds no bytes"},
    {"not-a-file", "a folder, a device or a pipe"},
    // The picture could not be decoded, or not as it stands.
    {"not-a-picture", "no format that is read"},
    {"picture-empty", "no pixels"},
    {"picture-too-large", "more pixels than are decoded"},
    {"picture-unsupported", "a variety of its format that is not read"},
    {"picture-truncated", "the file ends before its picture"},
    {"picture-damaged", "the data of the picture contradict themselves"},
    {"frame-failed", "a library gave up, or memory ran out"},
    // Remarks about a picture that was decoded.
    {"alpha-dropped", "transparency was left out"},
    {"more-pictures", "only the first picture of several was read"},
    {"profile-unusable", "the colour profile could not be used"},
    {"profile-of-tables", "the colour profile holds tables instead of curves"},
    {"gamma-stated", "the file states a gamma that linearised it"},
    {"transfer-stated", "the file states a transfer function that linearised it"},
    {"orientation-from-container", "the container's orientation overrules Exif"},
    {"crop-ignored", "a crop that the file recommends was not applied"},
    {"preview-small", "the embedded preview is smaller than the frame"},
    {"preview-only", "measured on the embedded preview"},
    {"raw-damaged", "the raw data are damaged"},
    {"raw-unknown-body", "the raw file's body is not known"},
    {"raw-unsupported", "the photosites of the raw file are not of red, green and blue"},
    {"not-raw", "the partner of a picture is no raw file"},
    // Capture data.
    {"metadata-unreadable", "the capture data, or a part of them, cannot be read"},
    {"metadata-value-absurd", "a value that no camera can have meant"},
    {"maker-note-unusable", "the maker note was displaced by an editor"},
    {"focus-area-misplaced", "the picture was cropped or turned since the focus area was recorded"},
    {"pixel-pitch-unknown", "no pixel pitch, or none to be relied upon"},
    {"orientation-unknown", "which side is up is not recorded"},
    {"setup-incomplete", "focal length or f-number is not known"},
    {"aim-outside-frame", "the aim given does not meet the frame"},
    {"contact-outside-frame", "the contact given does not meet the frame"},
    // The model.
    {"focus-distance-unusable", "nearer than the lens can focus"},
    {"no-solution", "no setting fulfils the wish"},
    // Sets.
    {"tone-edited", "the file names software that may have changed its tone"},
};

constexpr bool is_issue_code(std::string_view code) {
  for (const IssueCode& known : kIssueCodes) {
    if (known.code == code) return true;
  }
  return false;
}

}  // namespace focusfall
