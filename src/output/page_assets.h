// The script and the style of the page, bundled from src/page when the program is built.
#pragma once

#include <string_view>

namespace focusfall {

struct PageAssets {
  std::string_view script;         // empty: the program was built without Node or without its packages
  std::string_view style;
  std::string_view script_hash;    // "sha256-...", as a Content-Security-Policy names it
  std::string_view style_hash;
};

const PageAssets& page_assets();

}  // namespace focusfall
