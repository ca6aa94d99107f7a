#!/usr/bin/env python3
"""Standard streams that are full, closed, or read by somebody who goes away: said so, and no file harmed.

usage: test_streams.py PROGRAM [TEST ...]
"""
import itertools
import os
import resource
import signal
import subprocess

from bench import ENVIRONMENT, ProgramTest, SECONDS, main

# Every way of writing to standard output.
TALKING = [
    ["--help"], ["--version"], ["help", "fit"], ["fit", "--help"], ["check", "--help"], ["draw", "--help"], ["explain"],
    ["explain", "unknown-label"], ["check", "small.xml"], ["check", "clinic.xml", "cases.csv"],
    ["check", "clinic.xml", "cases.csv", "--json", "-"], ["fit", "clinic.xml", "cases.csv"],
    ["fit", "clinic.xml", "cases.csv", "--json", "-"], ["fit", "clinic.xml", "cases.csv", "-o", "-"],
    ["fit", "clinic.xml", "cases.csv", "-o", "/dev/stdout"], ["draw", "small.xml", "--records", "1", "-o", "-"],
    ["draw", "clinic.xml", "--records", "5000", "-o", "-"], ["draw", "small.xml", "--records", "1", "-o", "x.csv", "--json", "-"],
    ["explain", "--json", "-"],
]
FIT = ["fit", "clinic.xml", "cases.csv", "--ess", "0.5"]
WRITING = FIT + ["-o", "out.xml", "--json", "out.json"]


class Streams(ProgramTest):
    def by_shell(self, redirections, *words):
        """Status and standard error of a run whose descriptors a shell has changed."""
        done = subprocess.run(["sh", "-c", 'exec "$0" "$@" ' + redirections, self.program, *words], cwd=self.folder,
                              env=ENVIRONMENT, stdin=subprocess.DEVNULL, capture_output=True, timeout=SECONDS)
        return done.returncode, done.stderr

    def written(self):
        files = {name: self.read(name) for name in ("out.xml", "out.json") if os.path.exists(self.path(name))}
        for name in files:
            os.remove(self.path(name))
        return files

    def test_standard_output_is_full(self):
        for words in TALKING:
            status, err = self.by_shell(">/dev/full", *words)
            self.assertEqual(status, 3, "%s: %s" % (words, err))
            self.assertIn(b"No space left on device", err)
            self.assertTrue(err.endswith(b"[cannot-write]\n"))

    def test_standard_output_is_closed(self):
        for words in TALKING:
            status, err = self.by_shell(">&-", *words)
            self.assertEqual(status, 3, "%s: %s" % (words, err))
            self.assertRegex(err, b"(standard output|/dev/stdout): cannot be written: Bad file descriptor")

    def test_nothing_to_say_needs_no_standard_output(self):
        for redirection in (">&-", ">/dev/full"):
            self.assertEqual(self.by_shell(redirection, *WRITING, "--quiet")[0], 0)

    def test_files_are_complete_before_the_page(self):
        self.ballast(*WRITING)
        wanted = self.written()
        self.assertEqual(len(wanted), 2)
        for redirection in (">/dev/full", ">&-"):
            self.assertEqual(self.by_shell(redirection, *WRITING)[0], 3)
            self.assertEqual(self.written(), wanted)

    def test_every_combination_of_closed_descriptors(self):
        self.ballast(*WRITING)
        wanted = self.written()
        for closed in itertools.chain.from_iterable(itertools.combinations((0, 1, 2), n) for n in range(4)):
            redirections = " ".join("%d%s&-" % (fd, "<" if fd == 0 else ">") for fd in closed)
            status, err = self.by_shell(redirections, *WRITING)
            self.assertEqual(status, 3 if 1 in closed else 0, redirections)
            self.assertEqual(self.written(), wanted, redirections)
            self.assertEqual(err == b"", 2 in closed, "a warning goes to standard error: %s %s" % (redirections, err))
            status, err = self.by_shell(redirections, "fit", "nowhere.xml")
            self.assertEqual(status, 3)

    def test_standard_input_is_closed(self):
        for words in (["fit", "small.xml", "-"], ["check", "-"]):
            status, err = self.by_shell("<&-", *words)
            self.assertEqual(status, 3)
            self.assertTrue(err.endswith(b"[cannot-read]\n") or err.endswith(b"[cannot-open]\n"), err)

    def test_standard_input_is_a_folder(self):
        status, err = self.by_shell("<.", "fit", "small.xml", "-")
        self.assertEqual(status, 3, err)

    def test_reader_goes_away(self):
        """With the usual disposition the program ends silently; where SIGPIPE is ignored it says what happened."""
        ignoring = {"restore_signals": False}  # Python ignores SIGPIPE, and the program inherits that
        for how, status in (({}, 128 + signal.SIGPIPE), (ignoring, 3)):
            for words in (["draw", "clinic.xml", "--records", "100000", "-o", "-"], WRITING, ["--help"]):
                reader, writer = os.pipe()
                os.close(reader)
                process = self.start(*words, stdout=writer, **how)
                os.close(writer)
                done = self.finish(process, words, status=status)
                self.assertEqual(b"[cannot-write]" in done.err, status == 3)
            self.assertEqual(len(self.written()), 2)

    def test_reader_wants_one_line(self):
        process = self.start("draw", "clinic.xml", "--records", "200000", "-o", "-")
        self.assertEqual(process.stdout.readline(), self.read("cases.csv").splitlines(True)[0])
        process.stdout.close()
        self.assertEqual(process.wait(SECONDS), -signal.SIGPIPE)
        self.assertEqual(process.stderr.read(), b"")
        process.stderr.close()

    def test_standard_output_does_not_wait(self):
        """Somebody made the pipe non-blocking: every byte arrives all the same."""
        wanted = self.ballast("draw", "clinic.xml", "--records", "20000", "-o", "-").out
        reader, writer = os.pipe()
        os.set_blocking(writer, False)
        process = self.start("draw", "clinic.xml", "--records", "20000", "-o", "-", stdout=writer)
        os.close(writer)
        with os.fdopen(reader, "rb") as file:
            self.assertEqual(file.read(), wanted)
        self.finish(process)

    def test_limit_on_file_sizes(self):
        def limit():
            resource.setrlimit(resource.RLIMIT_FSIZE, (1024, 1024))

        self.write("out.xml", "old\n")
        for words in (WRITING, ["draw", "clinic.xml", "--records", "1000", "-o", "out.xml"]):
            before = self.names()
            done = self.ballast(*words, status=3, preexec_fn=limit)
            self.assertTrue(done.err.endswith(b"[cannot-write]\n"), done.err)
            self.assertIn(b"File too large", done.err)
            self.assertEqual((self.names(), self.read("out.xml")), (before, b"old\n"))

    def test_failure_leaves_standard_output_empty(self):
        self.write("bad.csv", "Cold,Cough\nno,yse\n")
        for words in (["fit", "small.xml", "bad.csv"], ["fit", "small.xml", "bad.csv", "-o", "-"],
                      ["fit", "small.xml", "bad.csv", "--json", "-"], ["check", "small.xml", "bad.csv", "--json", "-"]):
            self.assert_error(self.ballast(*words, status=1), "unknown-label")


if __name__ == "__main__":
    main()
