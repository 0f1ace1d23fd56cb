// Stands in for the bundle where the build had no Node or no packages for it.
#include "src/output/page_assets.h"

namespace focusfall {

const PageAssets& page_assets() {
  static const PageAssets assets{};
  return assets;
}

}  // namespace focusfall
