"""Files that are not what they should be: one clear line each, the other frames done, exit code 1."""
import base64
import hashlib
import json
import os
import re
import shutil
import subprocess
import unittest

from program import DONE, FRAMES_MISSING, PROGRAM, SAMPLES, CommandLineTest, environment, run

SAMPLE = SAMPLES / "stage-01-on.jpg"


class BadFileTest(CommandLineTest):
    def assert_refused(self, path, *said):
        """`path` between two good frames: they are done, it gets one line that names it and says what was expected."""
        good = [str(SAMPLE), str(SAMPLES / "stage-02-front.jpg")]
        result = run("check", "--format", "json", good[0], str(path), good[1])
        self.assertEqual(result.code, FRAMES_MISSING, result.err)
        records = result.records
        self.assertEqual([record["path"] for record in records], [good[0], str(path), good[1]])
        self.assertEqual([record["verdict"] is not None for record in records], [True, False, True])
        line = self.lines_about(result, path)
        self.assertIn("expected", line)
        for words in said:
            self.assertIn(words, line)
        return records[1]["issues"][0]["code"]

    def test_missing(self):
        self.assertEqual(self.assert_refused(self.folder / "none.jpg", "no such file"), "file-missing")

    def test_a_web_address_is_a_name(self):
        self.assertEqual(self.assert_refused("http://example.org/boat.jpg", "no such file"), "file-missing")

    def test_empty(self):
        self.assertEqual(self.assert_refused(self.write("empty.jpg", b""), "empty"), "file-empty")

    def test_truncated(self):
        content = SAMPLE.read_bytes()
        path = self.write("half.jpg", content[:len(content) // 2])
        self.assertEqual(self.assert_refused(path, "row"), "picture-truncated")

    def test_truncated_in_its_header(self):
        self.assertEqual(self.assert_refused(self.write("head.jpg", SAMPLE.read_bytes()[:20])), "picture-truncated")

    def test_padded_with_zeros_by_a_failing_card(self):
        content = SAMPLE.read_bytes()
        half = len(content) // 2
        self.assert_refused(self.write("zeroed.jpg", content[:half] + bytes(len(content) - half)), "row")

    def test_zeros_after_the_picture_do_no_harm(self):
        result = run("check", str(self.write("padded.jpg", SAMPLE.read_bytes() + bytes(100_000))))
        self.assertEqual(result.code, DONE, result.err)

    def test_no_picture(self):
        code = self.assert_refused(self.write("notes.jpg", b"Focus on the mark at ten.\n" * 20), "46 6F 63 75")
        self.assertEqual(code, "not-a-picture")
        self.assert_refused(self.write("zeros.jpg", bytes(5000)))
        self.assert_refused(self.write("program.jpg", b"\x7fELF" + bytes(2000)))

    def test_renamed_pictures_go_by_their_content(self):
        result = run("check", "--format", "json", str(self.sample(under="boat.txt")))
        self.assertEqual(result.code, DONE, result.err)
        self.assertIsNotNone(result.records[0]["verdict"])

    def test_a_fifo_is_not_waited_for(self):
        path = self.folder / "pipe.jpg"
        os.mkfifo(path)
        self.assertEqual(self.assert_refused(path, "FIFO"), "not-a-file")

    def test_a_device(self):
        self.assertEqual(self.assert_refused("/dev/zero", "device"), "not-a-file")

    def test_a_link_to_itself(self):
        path = self.folder / "self.jpg"
        path.symlink_to("self.jpg")
        self.assert_refused(path)

    def test_unreadable(self):
        path = self.sample()
        path.chmod(0)
        self.folder.chmod(0o755)
        # Root may read everything; then someone else asks, with a copy of the program that anyone may run.
        program = self.folder / "focusfall"
        shutil.copy(PROGRAM, program)
        other = {"user": 65534} if os.geteuid() == 0 else {}
        result = subprocess.run([program, "check", path], capture_output=True, text=True, timeout=60,
                                cwd=self.folder, env=environment(), **other)
        self.assertEqual(result.returncode, FRAMES_MISSING, result.stderr)
        self.assertIn("Permission denied", result.stderr)
        self.assertIn("expected a readable file", result.stderr)

    def test_no_capture_data_gives_blur_in_px_and_says_what_is_missing(self):
        content = SAMPLE.read_bytes()
        # Leaves out every application segment (0xFFE0 to 0xFFEF), the capture data among them.
        bare, at = content[:2], 2
        while content[at + 1] != 0xDA:
            end = at + 2 + int.from_bytes(content[at + 2:at + 4], "big")
            if content[at + 1] & 0xF0 != 0xE0:
                bare += content[at:end]
            at = end
        bare += content[at:]
        result = run("check", "--format", "json", str(self.write("bare.jpg", bare)))
        self.assertEqual(result.code, DONE, result.err)
        record = result.records[0]
        self.assertIsNone(record["verdict"]["defocus_um"])
        self.assertIsNone(record["verdict"]["focus_offset_m"])
        self.assertIsNotNone(record["measurement"]["aim"]["blur_disc_px"])
        self.assertIn("setup-incomplete", [issue["code"] for issue in record["issues"]])
        self.assertTrue(any("--focal-length" in issue["message"] for issue in record["issues"]))


class FolderTest(CommandLineTest):
    def test_a_loop_of_folders_is_walked_once(self):
        self.sample(under="day/a.jpg")
        (self.folder / "day" / "again").symlink_to("..")
        result = run("check", "--format", "json", str(self.folder / "day"))
        self.assertEqual(result.code, DONE, result.err)
        self.assertEqual([record["path"] for record in result.records], [str(self.folder / "day" / "a.jpg")])
        self.assertIn("1 link to a folder", result.err)

    def test_what_is_no_photograph_is_counted_and_hidden_entries_are_passed_over(self):
        self.sample(under="day/a.jpg")
        self.sample(under="day/.b.jpg")
        self.write("day/notes.txt", b"words")
        result = run("check", "--format", "json", str(self.folder / "day"))
        self.assertEqual((result.code, len(result.records)), (DONE, 1))
        self.assertIn("1 file of another type", result.err)
        self.assertIn("1 hidden entry", result.err)

    def test_a_file_reached_twice_is_done_once(self):
        path = self.sample(under="day/a.jpg")
        os.link(path, self.folder / "day" / "b.jpg")
        result = run("check", "--format", "json", str(self.folder / "day"), str(path))
        self.assertEqual(len(result.records), 1)
        self.assertIn("2 files met twice", result.err)


class NameTest(CommandLineTest):
    NAMES = {"escape": b"a\x1b[2J\x1b]0;owned\x07.jpg", "control": b"a\nb\tc\rd.jpg", "not UTF-8": b"a\xff\xfe\xc0.jpg",
             "right to left": "a\u202egpj.exe.jpg".encode(), "C1": b"a\xc2\x9b31m.jpg", "dash": b"--help.jpg",
             "blank": b" .jpg"}

    def test_names_do_not_act_on_a_terminal_and_come_back_from_json(self):
        for what, name in self.NAMES.items():
            with self.subTest(what):
                path = os.fsencode(self.folder) + b"/" + name
                for content in (SAMPLE.read_bytes(), b"no picture"):
                    with open(path, "wb") as file:
                        file.write(content)
                    for arguments in (["check"], ["check", "--brief"], ["check", "--format", "csv"]):
                        result = run(*arguments, "--level", "aim-only", path)
                        self.assertNotRegex(result.err, r"[\x00-\x09\x0b-\x1f\x7f\x80-\x9f\u202a-\u202e]")
                        if arguments != ["check", "--format", "csv"]:
                            self.assertNotRegex(result.out, r"[\x00-\x09\x0b-\x1f\x7f\x80-\x9f\u202a-\u202e]")
                    record = run("check", "--format", "json", "--level", "aim-only", path).records[0]
                    if "path_bytes" in record:
                        self.assertEqual(base64.b64decode(record["path_bytes"]), path)
                        self.assertIn("\ufffd", record["path"])
                    else:
                        self.assertEqual(record["path"].encode(), path)
                    self.assertEqual("path_bytes" in record, what == "not UTF-8")


@unittest.skipUnless(shutil.which("exiftool"), "exiftool is not installed")
class AbsurdCaptureDataTest(CommandLineTest):
    """Values that no camera can have meant are said, and taken as not known."""

    def record_with(self, *tags):
        path = self.sample()
        subprocess.run(["exiftool", "-q", "-q", "-n", "-m", "-overwrite_original", *tags, str(path)], check=True)
        result = run("check", "--format", "json", str(path))
        self.assertEqual(result.code, DONE, result.err)

        def refuse(name):
            self.fail(f"{name} in {tags}")
        return json.loads(result.out, parse_constant=refuse)

    def assert_said_and_unknown(self, key, *tags):
        record = self.record_with(*tags)
        self.assertIsNone(record["capture"][key])
        issues = [issue for issue in record["issues"] if issue["code"] == "metadata-value-absurd"]
        self.assertEqual(len(issues), 1, record["issues"])
        self.assertIn("expected", issues[0]["message"])
        self.assertIsNotNone(record["measurement"]["aim"]["blur_disc_px"])

    def test_f_number_zero(self):
        self.assert_said_and_unknown("f_number", "-FNumber=0", "-ApertureValue=")

    def test_focal_length_zero(self):
        self.assert_said_and_unknown("focal_length_mm", "-FocalLength=0", "-FocalLengthIn35mmFormat=")

    def test_exposure_time_zero(self):
        self.assert_said_and_unknown("exposure_time_s", "-ExposureTime=0", "-ShutterSpeedValue=")

    def test_a_date_in_1900(self):
        self.assert_said_and_unknown("taken_at", "-DateTimeOriginal=1900:01:01 00:00:00", "-CreateDate=",
                                     "-ModifyDate=")

    def test_a_distance_beyond_all_bounds(self):
        # 1e30 m does not fit a rational: the writer makes it the standard's infinity, 4294967295/0 or /1.
        distance = self.record_with("-SubjectDistance=1e30")["capture"]["focus_distance_m"]
        self.assertTrue(distance is None or distance["at_infinity"], distance)

    def test_texts_with_escape_sequences(self):
        path = self.sample()
        subprocess.run(["exiftool", "-q", "-overwrite_original", "-Model=Cam\x1b]0;owned\x07", "-LensModel==cmd|1",
                        str(path)], check=True)
        text = run("check", str(path))
        self.assertNotIn("\x1b", text.out)
        self.assertNotIn("\x07", text.out)
        row = run("check", "--format", "csv", str(path)).out
        self.assertIn("'=cmd|1", row)
        self.assertIsNone(re.search(r"(^|,)=", row))


class OriginalsTest(CommandLineTest):
    def test_keep_their_bytes_and_times(self):
        paths = [self.sample(name) for name in ("stage-01-on.jpg", "regatta-11-clipped-area.jpg", "bench-01.jpg")]
        paths.append(self.write("broken.jpg", b"\xff\xd8\xff" + bytes(100)))
        for path in paths:
            os.utime(path, ns=(10**18, 10**18 + 7))
            path.chmod(0o444)

        def state():
            found = {}
            for path in paths:
                status = path.stat()
                found[path] = (hashlib.sha256(path.read_bytes()).hexdigest(), status.st_mtime_ns, status.st_mode,
                               status.st_ino, status.st_size)
            return found
        before, entries = state(), sorted(os.listdir(self.folder))
        run("check", "--tiles", "--format", "json", *map(str, paths))
        run("predict", *map(str, paths))
        run("check", "--overlay", str(self.folder / "pictures"), *map(str, paths))
        self.assertEqual(state(), before)
        self.assertEqual(sorted(os.listdir(self.folder)), sorted(entries + ["pictures"]))


if __name__ == "__main__":
    unittest.main()
