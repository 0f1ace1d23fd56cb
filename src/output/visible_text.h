// Text from files and names, made safe for a terminal and measured in columns.
#pragma once

#include <string>
#include <string_view>

namespace focusfall {

// `text` with everything made visible that a terminal would act on or that would hide other text: control bytes and
// escapes as \x1b, \n, \t, invalid UTF-8 as \xff, directional and invisible marks as \u{202e}. What is printable stays.
std::string visible_text(std::string_view text);

// Columns that `text` takes on a terminal; wide characters count two. `text` has been made visible.
int text_columns(std::string_view text);

// `text` shortened to at most `columns`: "..." and its end, since paths differ at their ends.
std::string shortened(std::string_view text, int columns);

// `text` followed by the blanks that fill `columns`.
std::string padded(std::string_view text, int columns);

// `text` broken at blanks into lines of at most `columns`, each but the first after `indent` blanks. No newline at the
// end. A word that is longer than a line stands on its own.
std::string wrapped(std::string_view text, int columns, int indent);

}  // namespace focusfall
