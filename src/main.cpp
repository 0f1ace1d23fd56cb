#include <fmt/core.h>

int main() {
  fmt::print("focusfall: commands come with the next commits.\n");
  return 0;
}
