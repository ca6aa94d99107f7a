#!/usr/bin/env python3
"""Files that cannot be read or written, outputs that are inputs or each other, and what an output keeps of what stood there.

usage: test_files.py PROGRAM [TEST ...]
"""
import os
import subprocess
import threading

from bench import ENVIRONMENT, ProgramTest, SECONDS, main, obey_permissions

FIT = ["fit", "clinic.xml", "cases.csv"]
OLD = b"what stood here before\n"


class Inputs(ProgramTest):
    def test_what_cannot_be_opened(self):
        os.mkdir(self.path("folder"))
        os.symlink("loop", self.path("loop"))
        os.symlink("nowhere", self.path("dangling"))
        tries = [("nowhere", "No such file"), ("folder", "Is a directory"), ("loop", "Too many levels"),
                 ("dangling", "No such file"), ("n" * 300, "File name too long"), ("clinic.xml/below", "Not a directory"), ("", "No such file"),
                 ("http://127.0.0.1:9/clinic.xml", "No such file"), ("--help", "No such file")]
        for name, reason in tries:
            for words in (["check", "--", name], ["check", "--", "clinic.xml", name], ["fit", "--", name, "cases.csv"],
                          ["draw", "--records", "1", "-o", "-", "--", name]):
                done = self.ballast(*words, status=3)
                self.assert_error(done, "cannot-open", reason)
                self.assertTrue(done.err.decode().startswith(name), done.err)

    def test_no_permission(self):
        os.chmod(self.path("cases.csv"), 0)
        done = self.ballast(*FIT, status=3, preexec_fn=obey_permissions)
        self.assert_error(done, "cannot-open", "cases.csv: cannot be opened: Permission denied")

    def test_names_that_would_steer_a_terminal(self):
        for name, shown in ((b"a\nb", "a\\x0Ab"), (b"\x1b[31m", "\\x1B[31m"), (b"\xff\xc0", "\\xFF\\xC0"),
                            (b"\xe2\x80\xae", "\\xE2\\x80\\xAE"), (b"%s%n", "%s%n"), ("\u00e9".encode(), "\u00e9")):
            self.assert_error(self.ballast("check", name, status=3), "cannot-open", shown + ": ")
            self.assert_error(self.ballast("check", "clinic.xml", name, status=3), "cannot-open", shown + ": ")
            done = self.ballast(*FIT, "-o", os.path.join(b"nowhere", name), status=3)
            self.assert_error(done, "cannot-write", "nowhere/" + shown + ": ")
            os.rename(self.path("cases.csv"), os.path.join(self.folder.encode(), name))
            page = self.ballast("fit", "clinic.xml", name, "-o", b"out" + name).out.decode()
            self.assertIn(shown + ": 250 records", page)
            self.assertIn("out" + shown, page)
            os.rename(os.path.join(self.folder.encode(), name), self.path("cases.csv"))

    def test_name_that_begins_with_a_dash(self):
        os.rename(self.path("clinic.xml"), self.path("-clinic.xml"))
        self.ballast("check", "--", "-clinic.xml")
        self.ballast("check", "./-clinic.xml")
        self.assert_error(self.ballast("check", "-clinic.xml", status=2), "unknown-option")

    def test_a_file_called_dash(self):
        os.rename(self.path("clinic.xml"), self.path("-"))
        self.assert_error(self.ballast("check", "-", status=1), "empty-file", "standard input")
        self.ballast("check", "./-")

    def test_one_input_twice(self):
        self.assert_error(self.ballast("fit", "-", "-", status=2), "input-twice")
        self.assert_error(self.ballast("fit", "small.xml", "small.xml", status=2), "no-data")

    def test_messages_say_the_name_as_it_was_given(self):
        self.write("bad.csv", "Cold,Cough\nno,yse\n")
        for name in ("bad.csv", "./bad.csv", self.path("bad.csv"), "../" + os.path.basename(self.folder) + "/bad.csv"):
            done = self.ballast("fit", "small.xml", name, status=1)
            self.assertTrue(done.err.decode().startswith(name + ":2:4: "), done.err)


class Outputs(ProgramTest):
    def assert_untouched(self, before):
        self.assertEqual({name: self.read(name) for name in self.names() if os.path.isfile(self.path(name))}, before)

    def files(self):
        return {name: self.read(name) for name in self.names() if os.path.isfile(self.path(name))}

    def test_output_is_an_input(self):
        os.link(self.path("cases.csv"), self.path("hard.csv"))
        os.symlink("cases.csv", self.path("soft.csv"))
        os.symlink(self.folder, self.path("here"))
        before = self.files()
        for name in ("cases.csv", "./cases.csv", "hard.csv", "soft.csv", "here/cases.csv", self.path("cases.csv"), "clinic.xml"):
            for option in ("-o", "--json"):
                done = self.ballast(*FIT, option, name, status=2)
                self.assert_error(done, "output-is-input", name)
            self.assert_error(self.ballast("check", "clinic.xml", "cases.csv", "--json", name, status=2), "output-is-input")
        self.assert_error(self.ballast("draw", "clinic.xml", "--records", "1", "-o", "clinic.xml", status=2), "output-is-input")
        self.assert_untouched(before)

    def test_output_is_standard_input(self):
        before = self.files()
        with open(self.path("cases.csv"), "rb") as file:
            done = self.ballast("fit", "clinic.xml", "-", "-o", "cases.csv", status=2, stdin=file)
        self.assert_error(done, "output-is-input", "cases.csv")
        self.assert_untouched(before)

    def test_two_outputs_to_one_place(self):
        self.write("old", OLD)
        os.link(self.path("old"), self.path("hard"))
        os.symlink("new", self.path("soft"))
        os.symlink("soft", self.path("softer"))
        os.mkfifo(self.path("fifo"))
        before = self.files()
        for a, b in (("new", "new"), ("new", "./new"), ("new", self.path("new")), ("old", "hard"), ("soft", "softer"),
                     ("new", "soft"), ("-", "-"), ("-", "/dev/stdout"), ("/dev/stdout", "-"), ("fifo", "./fifo")):
            self.assert_error(self.ballast(*FIT, "-o", a, "--json", b, status=2), "one-output-twice")
        self.assertEqual(self.files(), before)
        self.assertEqual(self.ballast(*FIT, "-o", "new.xml", "--json", "new.json", "--quiet").out, b"")

    def test_what_cannot_be_written(self):
        os.mkdir(self.path("folder"))
        os.symlink("loop", self.path("loop"))
        for name, reason in (("folder", "Is a directory"), ("folder/", "Is a directory"), ("nowhere/x", "No such file"),
                             ("clinic.xml/x", "Not a directory"), ("loop", "Too many levels"), ("n" * 300, "File name too long")):
            for words in (FIT + ["-o", name], FIT + ["--json", name], ["draw", "clinic.xml", "--records", "9", "-o", name]):
                self.assert_error(self.ballast(*words, status=3), "cannot-write", name, reason)
        self.assert_error(self.ballast(*FIT, "-o", "", status=2), "bad-value", "--output")
        self.assert_error(self.ballast(*FIT, "--json=", status=2), "bad-value", "--json")

    def test_read_only_folder_is_seen_before_the_table_is_read(self):
        """The table is a FIFO without a writer: whoever opened it would wait for ever."""
        os.mkfifo(self.path("fifo"))
        os.mkdir(self.path("folder"), 0o555)
        for name in ("folder/out.xml", "nowhere/out.xml", "folder"):
            done = self.ballast("fit", "clinic.xml", "fifo", "-o", name, status=3, preexec_fn=obey_permissions)
            self.assert_error(done, "cannot-write", name)
        self.write("protected", OLD)
        os.chmod(self.path("protected"), 0o444)
        done = self.ballast("fit", "clinic.xml", "fifo", "--json", "protected", status=3, preexec_fn=obey_permissions)
        self.assert_error(done, "cannot-write", "Permission denied")
        self.assertEqual(self.read("protected"), OLD)

    def test_replaced_whole_and_mode_kept(self):
        wanted = self.ballast(*FIT, "-o", "-").out
        for old, mode in ((OLD, 0o640), (OLD * 100000, 0o600), (b"", 0o666), (OLD, 0o751)):
            self.write("out.xml", old)
            os.chmod(self.path("out.xml"), mode)
            self.ballast(*FIT, "-o", "out.xml", preexec_fn=lambda: os.umask(0o077))
            self.assertEqual(self.read("out.xml"), wanted)
            self.assertEqual(os.stat(self.path("out.xml")).st_mode & 0o7777, mode)

    def test_a_new_file_follows_the_umask(self):
        for umask, mode in ((0o022, 0o644), (0o077, 0o600), (0o027, 0o640), (0, 0o666)):
            self.ballast(*FIT, "-o", "out.xml", preexec_fn=lambda umask=umask: os.umask(umask))
            self.assertEqual(os.stat(self.path("out.xml")).st_mode & 0o7777, mode)
            os.remove(self.path("out.xml"))

    def test_links_are_kept(self):
        wanted = self.ballast(*FIT, "-o", "-").out
        os.mkdir(self.path("folder"))
        self.write("folder/old.xml", OLD)
        for link, target in (("soft", "folder/old.xml"), ("dangling", "folder/new.xml")):
            os.symlink(target, self.path(link))
            self.ballast(*FIT, "-o", link)
            self.assertEqual(os.readlink(self.path(link)), target)
            self.assertEqual(self.read(target), wanted)

    def test_a_fifo_and_devices(self):
        wanted = self.ballast(*FIT, "-o", "-").out
        os.mkfifo(self.path("fifo"))
        got = []
        reader = threading.Thread(target=lambda: got.append(self.read("fifo")))
        reader.start()
        self.ballast(*FIT, "-o", "fifo")
        reader.join(SECONDS)
        self.assertEqual(got, [wanted])
        self.ballast(*FIT, "-o", "/dev/null", "--json", "out.json")
        done = self.ballast(*FIT, "-o", "/dev/full", "--quiet", status=3)
        self.assert_error(done, "cannot-write", "/dev/full", "No space left")
        self.assertTrue(os.path.exists("/dev/null") and not os.path.isfile("/dev/null"))

    def test_names_of_standard_output(self):
        wanted = self.ballast(*FIT, "-o", "-").out
        for name in ("/dev/stdout", "/dev/fd/1", "/proc/self/fd/1"):
            self.assertEqual(self.ballast(*FIT, "-o", name).out, wanted)

    def test_two_runs_to_one_output(self):
        others = [FIT + ["--ess", ess, "--quiet"] for ess in ("3", "7")]
        wanted = [self.ballast(*words, "-o", "-").out for words in others]
        for _ in range(5):
            running = [self.start(*words, "-o", "out.xml") for words in others * 2]
            for process in running:
                self.finish(process)
            self.assertIn(self.read("out.xml"), wanted)

    def test_where_it_runs_does_not_matter(self):
        os.makedirs(self.path("deep/er"))
        at_home = self.ballast(*FIT, "-o", "a.xml", "--json", "a.json").out
        words = ["fit", "../../clinic.xml", self.path("cases.csv"), "-o", "a.xml", "--json", "../../deep/a.json"]
        elsewhere = self.ballast(*words, cwd=self.path("deep/er")).out
        self.assertEqual(elsewhere, at_home)
        self.assertEqual(self.read("deep/er/a.xml"), self.read("a.xml"))
        self.assertEqual(self.read("deep/a.json"), self.read("a.json"))

    def test_a_folder_that_is_gone(self):
        os.mkdir(self.path("gone"))
        script = 'cd gone && rmdir ../gone && exec "$0" "$@"'
        words = ["fit", self.path("clinic.xml"), self.path("cases.csv"), "-o", "x.xml"]
        done = subprocess.run(["sh", "-c", script, self.program, *words],
                              cwd=self.folder, env=ENVIRONMENT, capture_output=True, timeout=SECONDS)
        self.assertEqual(done.returncode, 3, done.stderr)
        self.assertIn(b"[cannot-write]", done.stderr)


if __name__ == "__main__":
    main()
