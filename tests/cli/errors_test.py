"""Exit codes and wrong use: 0 done, 1 some frames could not be done, 2 wrong use, 3 broken off, 130 interrupted."""
import os
import signal
import subprocess
import unittest

from program import (BROKEN_OFF, DONE, FRAMES_MISSING, INTERRUPTED, PROGRAM, SAMPLES, TOP, WRONG_USE, CommandLineTest,
                     environment, run)

SAMPLE = str(SAMPLES / "stage-01-on.jpg")


class WrongUseTest(CommandLineTest):
    def assert_wrong_use(self, arguments, *said):
        result = run(*arguments)
        self.assertEqual(result.code, WRONG_USE, result.err)
        self.assertEqual(result.out, "")
        lines = result.err.splitlines()
        self.assertEqual(len(lines), 1, result.err)
        self.assertTrue(lines[0].startswith("focusfall: "), lines[0])
        for words in said:
            self.assertIn(words, lines[0])

    def test_nothing_at_all(self):
        self.assert_wrong_use([], "a command or a photograph is needed")

    def test_a_word_that_is_neither_a_command_nor_a_file(self):
        self.assert_wrong_use(["chekc", SAMPLE], "chekc", "check", "predict")

    def test_no_photograph(self):
        self.assert_wrong_use(["check"], "a photograph or a folder is needed")

    def test_unknown_options_name_the_option(self):
        self.assert_wrong_use(["--bogus"], "no command")
        self.assert_wrong_use(["check", "--bogus", SAMPLE], "--bogus", "focusfall check --help")
        self.assert_wrong_use(["check", "--bogus"], "--bogus")
        self.assert_wrong_use(["predict", "--bogus"], "--bogus")

    def test_values_that_cannot_be_name_the_option_and_what_was_seen(self):
        for option, value in {"--focal-length": "400xx", "--f-number": "0", "--focus-distance": "-3m",
                              "--exposure-time": "1/0", "--iso": "fast", "--sensor": "36mm", "--pixel-pitch": "0um",
                              "--aim": "0.1,0.2,0.3", "--near-side": "below", "--contact": "high",
                              "--distance-from": "tripod", "--teleconverter": "0", "--acceptable-blur": "3",
                              "--delivered-width": "wide", "--workers": "0", "--format": "xml", "--level": "half",
                              "--flash-duration": "0", "--angular-rate": "fast", "--transmittance": "2"}.items():
            with self.subTest(option):
                self.assert_wrong_use(["check", option, value, SAMPLE], option, value)

    def test_a_value_that_is_missing(self):
        self.assert_wrong_use(["check", SAMPLE, "--settings"], "--settings")

    def test_options_that_exclude_each_other(self):
        self.assert_wrong_use(["check", "--no-settings", "--settings", "x", SAMPLE], "--no-settings", "--settings")
        self.assert_wrong_use(["predict", "--focal-length", "400mm", "--hold-depth", "28m..33m", "--reach-depth", "2m"],
                              "--hold-depth", "--reach-depth")

    def test_a_needed_value_that_was_not_given(self):
        self.assert_wrong_use(["predict"], "--focal-length", "--f-number")
        self.assert_wrong_use(["predict", "--focal-length", "400mm", "--f-number", "2.8", "--hold-blur", "20um"],
                              "--angular-rate", "--subject-speed")

    def test_a_list_that_is_not_there(self):
        self.assert_wrong_use(["check", "@" + str(self.folder / "none.txt")], "none.txt")

    def test_an_overlay_folder_that_cannot_be(self):
        self.assert_wrong_use(["check", "--overlay", SAMPLE, SAMPLE], "--overlay", "stage-01-on.jpg")

    def test_escape_sequences_of_an_option_do_not_reach_the_terminal(self):
        result = run("check", "--\x1b[31mred", SAMPLE)
        self.assertEqual(result.code, WRONG_USE)
        self.assertNotIn("\x1b", result.err)


class ExitCodeTest(CommandLineTest):
    def test_misses_and_no_evidence_are_done(self):
        result = run("check", str(SAMPLES / "regatta-01-front.jpg"), str(SAMPLES / "regatta-10-no-evidence.jpg"))
        self.assertEqual(result.code, DONE, result.err)

    def test_one_frame_that_could_not_be_done(self):
        result = run("check", "--format", "json", SAMPLE, str(self.folder / "none.jpg"))
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertIsNotNone(result.records[0]["verdict"])

    def test_a_wish_that_no_setting_fulfils(self):
        result = run("predict", "--focal-length", "400mm", "--hold-depth", "0.1m..33m")
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertEqual(len(result.err.splitlines()), 1)

    def test_help_and_version_are_data(self):
        for arguments in (["--help"], ["check", "--help"], ["predict", "--help"], ["--version"]):
            result = run(*arguments)
            self.assertEqual((result.code, result.err), (DONE, ""))
            self.assertNotEqual(result.out, "")

    def test_help_keeps_within_the_terminal_and_gives_a_default_for_every_option(self):
        for command in ("check", "lens", "predict"):
            result = run(command, "--help", columns=80)
            for line in result.out.splitlines():
                self.assertLessEqual(len(line), 80, line)
            options = result.out.split("\nOptions\n")[1].split("\nExamples\n")[0].split("\n  -")[1:]
            self.assertGreater(len(options), 10)
            for option in options:
                if option.startswith(("h --help", "-hold", "-reach")):
                    continue
                self.assertIn("Default:", " ".join(option.split()), option)

    def test_a_full_disk_breaks_the_run_off(self):
        if not os.path.exists("/dev/full"):
            self.skipTest("no /dev/full here")
        with open("/dev/full", "wb") as full:
            completed = subprocess.run([PROGRAM, "check", SAMPLE], stdout=full, stderr=subprocess.PIPE, cwd=TOP,
                                       env=environment(), timeout=60)
        self.assertEqual(completed.returncode, BROKEN_OFF)
        self.assertEqual(len(completed.stderr.splitlines()), 1, completed.stderr)

    def test_a_reader_that_closes_ends_the_run_quietly(self):
        process = subprocess.Popen([PROGRAM, "check", "--format", "json", str(SAMPLES)], stdout=subprocess.PIPE,
                                   stderr=subprocess.PIPE, cwd=TOP, env=environment())
        self.assertTrue(process.stdout.readline().endswith(b"}\n"))
        process.stdout.close()
        with process.stderr:
            errors = process.stderr.read().decode()
        self.assertEqual(process.wait(timeout=60), DONE)
        self.assertEqual([line for line in errors.splitlines() if not line.startswith("Passed over")], [])

    def test_an_interrupt_delivers_what_was_begun(self):
        # Thirty-six frames five times over: far from done when the signal comes.
        paths = []
        for copy in range(5):
            for sample in sorted(SAMPLES.glob("*.jpg")):
                link = self.folder / f"{copy}-{sample.name}"
                link.write_bytes(sample.read_bytes())
                paths.append(str(link))
        process = subprocess.Popen([PROGRAM, "check", "--format", "json", *paths], stdout=subprocess.PIPE,
                                   stderr=subprocess.PIPE, cwd=TOP, env=environment())
        first = process.stdout.readline()
        process.send_signal(signal.SIGINT)
        rest = process.stdout.read()
        self.assertEqual(process.wait(timeout=60), INTERRUPTED)
        lines = (first + rest).splitlines(keepends=True)
        self.assertLess(len(lines), len(paths))
        self.assertTrue(all(line.endswith(b"}\n") for line in lines))
        process.stderr.close()
        process.stdout.close()


class ImpliedCommandTest(CommandLineTest):
    def test_a_bare_file_runs_check_and_says_so(self):
        bare, named = run(SAMPLE), run("check", SAMPLE)
        self.assertEqual(bare.code, DONE)
        self.assertEqual(bare.out, named.out)
        self.assertEqual(bare.err, "A bare file runs check.\n")

    def test_options_after_a_bare_file_are_those_of_check(self):
        self.assertEqual(len(run(SAMPLE, "--format", "json").records), 1)


if __name__ == "__main__":
    unittest.main()
