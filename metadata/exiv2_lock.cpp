#include "metadata/exiv2_lock.h"

namespace focusfall {

std::mutex& exiv2_mutex() {
  static std::mutex mutex;
  return mutex;
}

}  // namespace focusfall
