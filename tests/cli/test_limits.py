#!/usr/bin/env python3
"""Inputs without an end, inputs beyond the limits, and a system that gives little: an answer, in bounded time and memory.

usage: test_limits.py PROGRAM [TEST ...]
"""
import itertools
import os
import resource
import subprocess
import threading

from bench import SECONDS, ProgramTest, SANITIZED, main, skip

MIB = 1 << 20


def limited(**limits):
    """For preexec_fn: limits by the names of the resource module, such as AS."""
    def set_limits():
        for name, value in limits.items():
            resource.setrlimit(getattr(resource, "RLIMIT_" + name), (value, value))
    return set_limits


def chain(n, outcomes=2):
    """A network of n variables, each the parent of the next."""
    labels = "".join("<OUTCOME>o%d</OUTCOME>" % k for k in range(outcomes))
    parts = ['<BIF VERSION="0.3"><NETWORK><NAME>chain (invented)</NAME>\n']
    parts += ['<VARIABLE TYPE="nature"><NAME>v%d</NAME>%s</VARIABLE>\n' % (v, labels) for v in range(n)]
    for v in range(n):
        parts.append("<DEFINITION><FOR>v%d</FOR>%s<TABLE>%s</TABLE></DEFINITION>\n" % (
            v, "<GIVEN>v%d</GIVEN>" % (v - 1) if v else "", "0.25 0.75 " * (2 if v else 1)))
    return "".join(parts) + "</NETWORK></BIF>\n"


class Endless(ProgramTest):
    def fed(self, begin, forever, *words, megabytes=300, status=1):
        """A run whose standard input begins so and then repeats for ever."""
        how = {} if SANITIZED else {"preexec_fn": limited(AS=megabytes * MIB)}
        process = self.start(*words, stdin=subprocess.PIPE, **how)
        piece = forever * (65536 // len(forever) + 1)

        def write():
            try:
                for part in itertools.chain([begin], itertools.repeat(piece)):
                    process.stdin.write(part)
            except (BrokenPipeError, ValueError):
                pass

        writer, watchdog = threading.Thread(target=write), threading.Timer(SECONDS, process.kill)
        writer.start()
        watchdog.start()
        out, err = process.stdout.read(), process.stderr.read()
        process.wait()
        watchdog.cancel()
        process.stdout.close()
        process.stderr.close()
        writer.join()
        try:
            process.stdin.close()
        except BrokenPipeError:
            pass
        self.assertEqual(process.returncode, status, err)
        self.assertEqual(out, b"")
        return err

    def test_tables(self):
        header = self.read("cases.csv").splitlines(True)[0]
        record = self.read("cases.csv").splitlines(True)[1]
        for begin, forever, code in ((b"", b"\0", b"control-character"), (b"", b"y\n", b"missing-column"),
                                     (b"", b"y", b"cell-too-long"), (b"", b"y,", b"duplicate-column"), (b"", b",", b"empty-column"), (b"", b"\n", b"no-header"),
                                     (b'"', b"y", b"unclosed-quote"), (header, b"\0", b"control-character"),
                                     (header, b"winter,", b"ragged-record"), (header + b'"', b"y\n", b"unclosed-quote"),
                                     (header, b"\xff", b"bad-utf8"), (header + record, b"<a>\n", b"ragged-record")):
            err = self.fed(begin, forever, "fit", "clinic.xml", "-")
            self.assertTrue(err.rstrip().endswith(b"[" + code + b"]"), (begin[:20], forever, err))

    def test_networks(self):
        """A network is held in memory up to its limit of 512 MiB."""
        if SANITIZED:
            skip("takes twice the memory")
        for begin, forever in ((b"", b"\0"), (b'<BIF VERSION="0.3"><NETWORK>', b"<x/>\n")):
            err = self.fed(begin, forever, "check", "-", megabytes=700)
            self.assertIn(b"[", err)

    def test_devices(self):
        self.assert_error(self.ballast("fit", "clinic.xml", "/dev/zero", status=1), "control-character")
        self.assert_error(self.ballast("fit", "clinic.xml", "/dev/null", status=1), "no-header")
        self.assert_error(self.ballast("fit", "/dev/null", status=1), "empty-file")


class Sizes(ProgramTest):
    def test_file_too_large(self):
        with open(self.path("large.xml"), "wb") as file:
            file.truncate(512 * MIB + 1)  # a hole: it takes no room on the disk
        self.assert_error(self.ballast("check", "large.xml", status=1), "file-too-large", "536870912")

    def test_outcomes(self):
        for n, status in ((65534, 0), (65535, 1)):
            labels = "".join("<OUTCOME>%d</OUTCOME>\n" % k for k in range(n))
            variable = '<VARIABLE TYPE="nature"><NAME>A</NAME>%s</VARIABLE>' % labels
            self.write("wide.xml", '<BIF VERSION="0.3"><NETWORK>%s</NETWORK></BIF>' % variable)
            done = self.ballast("check", "wide.xml", status=status)
            if status:
                self.assert_error(done, "too-many-outcomes", "65535 outcomes")

    def test_cells(self):
        for n, status in ((MIB, 0), (MIB + 1, 1)):
            self.write("wide.csv", "Cold,note,Cough\nno,%s,dry\n" % ("x" * n))
            done = self.ballast("check", "small.xml", "wide.csv", status=status)
            if status:
                self.assert_error(done, "cell-too-long", "wide.csv:2:4")

    def test_columns(self):
        for n, status in ((100000, 0), (1 << 20, 1)):
            self.write("wide.csv", "Cold,Cough,%s\nno,dry%s\n" % (",".join(map(str, range(n))), ",x" * n))
            done = self.ballast("check", "small.xml", "wide.csv", status=status)
            if status:
                self.assert_error(done, "too-many-columns")
            else:
                self.assertIn(b"100000 columns are not variables", done.err)
                self.assertLess(len(done.err), 2000)

    def test_long_lines(self):
        filling = ",".join(["x" * 1000] * 5000)
        names = ",".join("c%d" % c for c in range(5000))
        self.write("long.csv", "Cold,Cough,%s\nno,dry,%s\nyes,wet,%s\n" % (names, filling, filling))
        self.assertIn(b"2 records", self.ballast("check", "small.xml", "long.csv").out)

    def test_many_faults_are_few_lines(self):
        self.write("bad.csv", "Cold,Cough\n" + "no,x\n" * 30000 + "NA,dry\n" * 30000)
        done = self.ballast("fit", "small.xml", "bad.csv", status=1)
        self.assertLess(len(done.err.splitlines()), 25)
        self.assertIn(b"29,990 more", done.err)
        self.assertIn(b"30,000 missing", done.err)

    def test_many_cells(self):
        self.assert_error(self.ballast("check", "clinic.xml", "--max-cells", "133", status=1), "too-many-cells")
        self.ballast("check", "clinic.xml", "--max-cells", "134")


class LittleIsGiven(ProgramTest):
    def test_limits_that_suffice(self):
        if SANITIZED:
            skip("a sanitizer wants more")
        self.ballast("fit", "clinic.xml", "cases.csv", "-o", "wanted.xml", "--json", "wanted.json")
        wanted = self.read("wanted.xml"), self.read("wanted.json")
        for limits in ({"AS": 200 * MIB}, {"NOFILE": 8}, {"STACK": 65536},
                       {"AS": 200 * MIB, "NOFILE": 8, "STACK": 65536, "CPU": 10}):
            self.ballast("check", "clinic.xml", "cases.csv", preexec_fn=limited(**limits))
            self.ballast("draw", "clinic.xml", "--records", "5000", "-o", "drawn.csv", preexec_fn=limited(**limits))
            self.ballast("fit", "clinic.xml", "cases.csv", "-o", "out.xml", "--json", "out.json", "--threads", "2",
                         preexec_fn=limited(**limits))
            self.assertEqual((self.read("out.xml"), self.read("out.json")), wanted, limits)

    def test_too_little_memory(self):
        """Whatever the limit is: an answer or a message, never a crash and never half a file."""
        if SANITIZED:
            skip("a sanitizer wants more")
        self.write("chain.xml", chain(3000))
        self.ballast("draw", "chain.xml", "--records", "50", "-o", "chain.csv")
        words = ["fit", "chain.xml", "chain.csv", "--ess", "4", "--quiet", "--threads", "1"]
        self.ballast(*words, "-o", "wanted.xml")
        wanted, failed = self.read("wanted.xml"), 0
        least = next(megabytes for megabytes in range(4, 1000, 2)
                     if self.ballast("--version", status=None, preexec_fn=limited(AS=megabytes * MIB)).status == 0)
        for megabytes in range(least, least + 20):
            done = self.ballast(*words, "-o", "out.xml", status=None, preexec_fn=limited(AS=megabytes * MIB))
            self.assertIn(done.status, (0, 3), done.err)
            if done.status == 0:
                self.assertEqual(self.read("out.xml"), wanted)
                os.remove(self.path("out.xml"))
            else:
                failed += 1
                self.assert_error(done, "out-of-memory")
                self.assertFalse(os.path.exists(self.path("out.xml")))
        self.assertGreater(failed, 0)

    def test_a_deep_network_on_a_small_stack(self):
        n = 300 if SANITIZED else 5000
        how = {} if SANITIZED else {"preexec_fn": limited(STACK=65536)}
        self.write("chain.xml", chain(n))
        self.ballast("draw", "chain.xml", "--records", "20", "-o", "chain.csv", **how)
        self.ballast("fit", "chain.xml", "chain.csv", "-o", "out.xml", "--json", "out.json", "--ess", "4", "--folds", "2", **how)
        self.assertEqual(self.read("out.xml").count(b"<DEFINITION>"), n)

    def test_a_long_cycle(self):
        self.write("cycle.xml", chain(1000).replace("<FOR>v0</FOR><TABLE>0.25 0.75 </TABLE>", "<FOR>v0</FOR><GIVEN>v999</GIVEN>"))
        done = self.ballast("check", "cycle.xml", status=1)
        self.assert_error(done, "cycle", "v1 -> v2 -> v3", "(1000 arcs) -> v0 -> v1")


if __name__ == "__main__":
    main()
