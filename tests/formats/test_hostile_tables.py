#!/usr/bin/env python3
"""test_hostile_tables.py PROGRAM [--slack N] [NAME]: every table of hostile_tables.py through `ballast check` or `ballast fit`.

PROGRAM is ballast, or csv_driver (tests/reference), which reads a table and does nothing with it. --slack N allows N times the
time and memory, for builds that check more than they should be fast.
"""
import os
import re
import subprocess
import sys
import tempfile
import time

HERE = os.path.dirname(os.path.abspath(__file__))
sys.path.insert(0, os.path.join(HERE, "..", "support"))
from hostile_tables import CLINIC, PLAIN, cases  # noqa: E402
from networks import write_network  # noqa: E402

MESSAGE = re.compile(r"^(warning: |note: )?[^\n]*\[[a-z0-9-]+\]$")
LONGEST_WAIT = 60
LONGEST_PAGE = 1 << 20  # what this process holds counts as its children's memory


class Run:
    """One run of the program and what it took."""

    def __init__(self, arguments, folder, feed=None, pause=0.0):
        out, err = open(os.path.join(folder, "out"), "w+b"), open(os.path.join(folder, "err"), "w+b")
        with out, err:
            process = subprocess.Popen(arguments, stdin=subprocess.PIPE if feed is not None else subprocess.DEVNULL, stdout=out, stderr=err,
                                       cwd=folder)
            self.fed = 0
            if feed is not None:
                self._feed(process, feed, pause)
            _, status, usage = os.wait4(process.pid, 0)
            process.returncode = os.waitstatus_to_exitcode(status)
            out.seek(0)
            err.seek(0)
            self.status = process.returncode
            self.page, self.messages = (file.read(LONGEST_PAGE).decode() for file in (out, err))
        os.unlink(out.name)
        os.unlink(err.name)
        self.seconds, self.mebibytes = usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024

    def _feed(self, process, feed, pause):
        end = time.monotonic() + LONGEST_WAIT
        try:
            for chunk in feed:
                if time.monotonic() > end:
                    process.kill()
                process.stdin.write(chunk)
                process.stdin.flush()
                self.fed += len(chunk)
                if pause:
                    time.sleep(pause)
            process.stdin.close()
        except BrokenPipeError:
            pass


class Tester:
    def __init__(self, program, slack, folder):
        self.program, self.slack, self.folder = os.path.abspath(program), slack, folder
        self.is_driver = os.path.basename(program) == "csv_driver"
        self.pages = {}

    def network(self, variables):
        path = os.path.join(self.folder, "network")
        if self.is_driver:
            with open(path, "w", encoding="utf-8", newline="") as file:
                file.write("".join("\t".join([name] + labels) + "\n" for name, labels in variables.items()))
        else:
            write_network(path, variables)
        return path

    def arguments(self, case, table):
        network = self.network(case.variables)
        begin = [self.program] if self.is_driver else [self.program, case.command]
        return begin + [network, table] + case.options

    def run(self, case):
        if case.most_read:
            return Run(self.arguments(case, "-"), self.folder, case.chunks())
        table = os.path.join(self.folder, case.file_name)
        with open(table, "wb") as file:
            for chunk in case.chunks():
                file.write(chunk)
        result = Run(self.arguments(case, case.file_name), self.folder)
        os.unlink(table)
        return result

    def comparable(self, run):
        """A page without what names the file: the driver ends with the file's size and digest."""
        lines = run.page.replace("standard input", "table.csv").replace("table.tsv.gz", "table.csv").split("\n")
        return "\n".join(lines[:-2] if self.is_driver else lines)

    def check(self, case):
        """What is wrong with the run of a case: a list of sentences."""
        run = self.run(case)
        wrong = []
        name = "standard input" if case.most_read else case.file_name
        lines = run.messages.split("\n")[:-1]
        refusals = [line for line in lines if not line.startswith(("warning: ", "note: "))]
        if run.status != case.exit:
            wrong.append("status %d, expected %d" % (run.status, case.exit))
        wrong += ["no message says %r" % word for word in case.words if word not in run.messages]
        wrong += ["a message shows %r" % word for word in case.absent if word in run.messages or word in run.page]
        wrong += ["not a message: %r" % line for line in lines if not MESSAGE.match(line) or re.search("[\x00-\x1f\x7f]", line)]
        if case.exit == 0 and refusals:
            wrong.append("a refusal without a status")
        if case.exit == 1:
            begin = name + (":" + case.place if case.place else "")
            if not refusals or not refusals[0].startswith(begin + ": "):
                wrong.append("the first refusal is not at %s" % begin)
            if not refusals or not refusals[0].endswith("[%s]" % case.code):
                wrong.append("the first refusal is not [%s]" % case.code)
        for code in set(re.findall(r"\[([a-z0-9-]+)\]$", run.messages, re.M)):
            told = [line for line in lines if line.endswith("[%s]" % code)]
            if len(told) > 11:
                wrong.append("%d messages of [%s]" % (len(told), code))
        if run.seconds > case.seconds * self.slack:
            wrong.append("%.1f seconds of processor time" % run.seconds)
        if run.mebibytes > case.mebibytes * self.slack:
            wrong.append("%.0f MiB" % run.mebibytes)
        if case.most_read and run.fed > case.most_read:
            wrong.append("%d bytes were taken" % run.fed)
        left = set(os.listdir(self.folder)) - {"network"}
        if left:
            wrong.append("left behind: %s" % left)
        self.pages[case.name] = self.comparable(run)
        if case.same_as and self.pages[case.name] != self.pages[case.same_as]:
            wrong.append("the page differs from that of %r" % case.same_as)
        return [sentence + "\n" + run.messages[:1500] for sentence in wrong[:1]] + wrong[1:]

    def check_trickle(self):
        """The plain table through a pipe, one byte at a time, gives the plain page."""
        arguments = [self.program] + ([] if self.is_driver else ["check"]) + [self.network(CLINIC), "-"]
        run = Run(arguments, self.folder, (bytes([byte]) for byte in PLAIN.encode()), pause=0.002)
        if run.status != 0:
            return ["status %d\n%s" % (run.status, run.messages)]
        return [] if self.comparable(run) == self.pages["plain"] else ["the page differs from that of the file"]

    def check_second_pass(self):
        """Where the records may not be kept, a second pass over a pipe is refused."""
        if self.is_driver:
            return []
        run = Run([self.program, "check", self.network(CLINIC), "-", "--memory", "0"], self.folder, [PLAIN.encode()])
        return [] if run.status == 3 and "save it to a file" in run.messages else ["status %d\n%s" % (run.status, run.messages)]


def main():
    arguments = sys.argv[1:]
    slack = float(arguments.pop(arguments.index("--slack") + 1)) if "--slack" in arguments else 1.0
    arguments = [argument for argument in arguments if argument != "--slack"]
    names = arguments[1:]
    failed = passed = 0
    with tempfile.TemporaryDirectory() as folder:
        tester = Tester(arguments[0], slack, folder)
        tests = [(case.name, lambda case=case: tester.check(case)) for case in cases()]
        tests += [("one byte at a time through a pipe", tester.check_trickle), ("a second pass over a pipe", tester.check_second_pass)]
        for name, test in tests:
            if names and name not in names and name != "plain":
                continue
            wrong = test()
            passed += not wrong
            failed += bool(wrong)
            if wrong:
                print("%s: %s" % (name, "; ".join(wrong)))
    print("%d passed, %d failed" % (passed, failed))
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
