// The page of `report` and `review`: records and small pictures in one HTML file that loads nothing from anywhere.
//
// Everything that comes from files travels as JSON or base64 in elements that the browser does not run; the script
// puts it on the page as text. The page's own policy allows its one script and its one style, by their hashes.
#pragma once

#include <nlohmann/json.hpp>
#include <string>
#include <vector>

namespace focusfall {

// Octets of JPEG pictures, upright; empty where there is none.
struct PagePictures {
  std::string whole;
  std::string aim;                       // the aim, one picture pixel for one pixel
};

struct PageFrame {
  nlohmann::ordered_json record;         // schema focusfall.frame/1, best with the tile map
  PagePictures pictures;
};

struct PageOptions {
  std::string title;
  std::string version;                   // of the program
  nlohmann::ordered_json more;           // further keys of the page's data, such as `review`
  std::string image_source = "data:";    // what the policy lets images come from
  std::string connect_source = "'none'"; // and what the script may ask
};

// False where the program was built without the page.
bool page_is_built();

// The file, UTF-8. Same input, same bytes.
std::string page_html(const std::vector<PageFrame>& frames, const PageOptions& options);

// The first bytes of every page: what tells a page of ours from somebody's file.
inline constexpr const char* kPageStart = "<!doctype html>\n<html lang=\"en\" data-program=\"focusfall\">\n";

// A record as the page carries it: absent values left out, the tile map thinned to at most 24 x 16 octets.
nlohmann::ordered_json page_record(nlohmann::ordered_json record);

}  // namespace focusfall
