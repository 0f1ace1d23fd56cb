// Prints what `check` costs against decoding alone: the ratio of CPU time over the same files, on one thread, and the
// memory at its highest. Decoding alone is a full RGB decode by libjpeg-turbo into a reused buffer.
//
// With --once full|aim one frame is processed twice and nothing is timed: for `valgrind --tool=callgrind`, where the
// difference of two runs with --repeat 1 and 2 gives the instructions of one frame.
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cstdio>
#include <ctime>
#include <fmt/core.h>
#include <fstream>
#include <iterator>
#include <jpeglib.h>
#include <opencv2/core.hpp>
#include <vector>

#include "metadata/read_capture.h"
#include "src/pipeline/frame_worker.h"
#include "tests/bench/bench_frames.h"

namespace focusfall::bench {
namespace {

using Bytes = std::vector<std::byte>;

double cpu_s() {
  timespec t{};
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return static_cast<double>(t.tv_sec) + 1e-9 * static_cast<double>(t.tv_nsec);
}

Bytes read_bytes(const std::filesystem::path& path) {
  std::ifstream file(path, std::ios::binary);
  const std::vector<char> chars{std::istreambuf_iterator<char>(file), {}};
  const auto* first = reinterpret_cast<const std::byte*>(chars.data());
  return {first, first + chars.size()};
}

// Decoding alone, to RGB.
class DecodeLoop {
 public:
  DecodeLoop() {
    codec_.err = jpeg_std_error(&errors_);
    jpeg_create_decompress(&codec_);
  }
  ~DecodeLoop() { jpeg_destroy_decompress(&codec_); }
  DecodeLoop(const DecodeLoop&) = delete;
  DecodeLoop& operator=(const DecodeLoop&) = delete;

  void decode(const Bytes& bytes) {
    jpeg_mem_src(&codec_, reinterpret_cast<const unsigned char*>(bytes.data()), bytes.size());
    jpeg_read_header(&codec_, TRUE);
    codec_.out_color_space = JCS_RGB;
    jpeg_start_decompress(&codec_);
    rgb_.resize(std::size_t{3} * codec_.output_width * codec_.output_height);
    while (codec_.output_scanline < codec_.output_height) {
      JSAMPROW row = rgb_.data() + std::size_t{3} * codec_.output_width * codec_.output_scanline;
      jpeg_read_scanlines(&codec_, &row, 1);
    }
    jpeg_finish_decompress(&codec_);
  }

 private:
  jpeg_decompress_struct codec_{};
  jpeg_error_mgr errors_{};
  std::vector<unsigned char> rgb_;
};

FrameWorker worker(bool aim_only) {
  UserValues user;
  user.level = aim_only ? MeasureLevel::aim_only : MeasureLevel::full;
  user.tiles = !aim_only;
  return {user, Settings{}};
}

void process(FrameWorker& frames, const std::string& path, const Bytes& bytes) {
  const FrameRecord record = frames.process(path, bytes);
  if (!record.done) throw std::runtime_error(path + " could not be done");
}

// Highest resident memory of a process that measures the files, megabytes.
double peak_memory_mb(bool aim_only, const std::vector<std::string>& paths) {
  const pid_t child = fork();
  if (child == 0) {
    FrameWorker frames = worker(aim_only);
    for (const std::string& path : paths) static_cast<void>(frames.process(path));
    _exit(0);
  }
  rusage usage{};
  int status = 0;
  wait4(child, &status, 0, &usage);
  return static_cast<double>(usage.ru_maxrss) / 1024;
}

void compare_cost(const std::vector<std::string>& paths, const std::vector<Bytes>& files, int rounds) {
  DecodeLoop decode;
  double decode_s = 0;
  struct Path {
    const char* name;
    FrameWorker frames;
    double seconds = 0;
  };
  Path measured[] = {{"check --aim-only", worker(true)}, {"check --tiles", worker(false)}};
  for (auto& path : measured) process(path.frames, paths[0], files[0]);   // tables are made once
  for (int round = 0; round < rounds; ++round) {
    for (std::size_t i = 0; i < files.size(); ++i) {
      const double start = cpu_s();
      decode.decode(files[i]);
      decode_s += cpu_s() - start;
      for (auto& path : measured) {
        const double before = cpu_s();
        process(path.frames, paths[i], files[i]);
        path.seconds += cpu_s() - before;
      }
    }
  }
  const double frames = rounds * static_cast<double>(files.size());
  fmt::print("{:<20}{:>12}{:>14}\n", "", "CPU ms/frame", "x decoding");
  fmt::print("{:<20}{:>12.1f}{:>14.2f}\n", "decoding to RGB", 1e3 * decode_s / frames, 1.0);
  for (const auto& path : measured) {
    fmt::print("{:<20}{:>12.1f}{:>14.2f}\n", path.name, 1e3 * path.seconds / frames, path.seconds / decode_s);
  }
}

int run(int argc, char** argv) {
  CLI::App app{"Cost of check against decoding alone"};
  std::string folder = "bench-frames", once;
  int count = 24, rounds = 2, repeat = 1;
  app.add_option("--frames", folder, "folder of the frames, made on first use")->capture_default_str();
  app.add_option("--count", count, "how many frames")->capture_default_str();
  app.add_option("--rounds", rounds, "how often they are gone through")->capture_default_str();
  app.add_option("--once", once, "process the first frame only: full or aim")->check(CLI::IsMember({"full", "aim"}));
  app.add_option("--repeat", repeat, "with --once: how often")->capture_default_str();
  CLI11_PARSE(app, argc, argv);

  cv::setNumThreads(1);
  initialise_capture_reading();
  std::vector<std::string> paths;
  for (const auto& path : ensure_frames(folder, count)) paths.push_back(path.string());
  if (!once.empty()) {
    FrameWorker frames = worker(once == "aim");
    const Bytes bytes = read_bytes(paths[0]);
    for (int i = 0; i < repeat; ++i) process(frames, paths[0], bytes);
    return 0;
  }
  const double aim_mb = peak_memory_mb(true, paths), full_mb = peak_memory_mb(false, paths);
  std::vector<Bytes> files;
  double bytes = 0;
  for (const auto& path : paths) {
    files.push_back(read_bytes(path));
    bytes += static_cast<double>(files.back().size());
  }
  fmt::print("{} frames of {} x {} px, {:.2f} byte/px, {} rounds\n", count, kFrameWidth, kFrameHeight,
             bytes / count / kFrameWidth / kFrameHeight, rounds);
  compare_cost(paths, files, rounds);
  fmt::print("highest memory: {:.0f} MB with --aim-only, {:.0f} MB with --tiles\n", aim_mb, full_mb);
  return 0;
}

}  // namespace
}  // namespace focusfall::bench

int main(int argc, char** argv) { return focusfall::bench::run(argc, argv); }
