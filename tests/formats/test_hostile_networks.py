#!/usr/bin/env python3
"""test_hostile_networks.py PROGRAM [--slack N] [NAME]: every network file of hostile_networks.py through `ballast check`.

--slack N allows N times the time and memory, for builds that check more than they should be fast, and for busy machines.
"""
import os
import re
import resource
import shutil
import subprocess
import sys
import tempfile

HERE = os.path.dirname(os.path.abspath(__file__))
sys.path.insert(0, os.path.join(HERE, "..", "support"))
from hostile_networks import cases  # noqa: E402
from program import Trial  # noqa: E402

MESSAGE = re.compile(r"^(warning: )?[^\n]*\[[a-z0-9-]+\]$")
LONGEST_WAIT = 60
LONGEST_PAGE = 1 << 16  # what this process holds counts as its children's memory
FILE = "model.xml"


class Run:
    """One run of the program and what it took."""

    def __init__(self, arguments, folder, environment=None, stack=None, traced=None):
        def limit():
            if stack:
                resource.setrlimit(resource.RLIMIT_STACK, (stack << 10, stack << 10))
        if traced:
            arguments = ["strace", "-f", "-qq", "-o", traced, "-e", "trace=open,openat,openat2,socket,connect,execve"] + arguments
        with tempfile.TemporaryFile() as out, tempfile.TemporaryFile() as err:
            process = subprocess.Popen(arguments, stdin=subprocess.DEVNULL, stdout=out, stderr=err, cwd=folder, preexec_fn=limit,
                                       env=environment)
            _, status, usage = os.wait4(process.pid, 0)
            self.status = process.returncode = os.waitstatus_to_exitcode(status)
            out.seek(0)
            err.seek(0)
            self.page, self.messages = (file.read(LONGEST_PAGE).decode(errors="replace") for file in (out, err))
        self.seconds, self.mebibytes = usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024


class Tester:
    def __init__(self, program, slack, folder):
        self.program, self.slack, self.folder = os.path.abspath(program), slack, folder
        self.has_strace = bool(shutil.which("strace")) and self.can_trace()
        self.slowest, self.largest = (0.0, ""), (0.0, "")

    def can_trace(self):
        return subprocess.run(["strace", "-qq", "-o", "/dev/null", "true"], stderr=subprocess.DEVNULL).returncode == 0

    def environment(self, case):
        """A small one when the stack is small: it takes room there."""
        return dict({} if case.stack else os.environ, **case.environment)

    def opened_after(self, case):
        """What the program opens or connects to once it has opened the file."""
        traced = os.path.join(self.folder, "trace")
        Run([self.program, "check", FILE], self.folder, self.environment(case), traced=traced)
        with open(traced, encoding="utf-8", errors="replace") as file:
            calls = [re.sub(r"^\d+ +", "", line.rstrip("\n")) for line in file]
        os.unlink(traced)
        at = [i for i, call in enumerate(calls) if '"%s"' % FILE in call and call.startswith("open")]
        if not at:
            return ["the file itself was not opened"]
        return [call for call in calls[at[0] + 1:] if not re.search(r'"/(proc|sys)/', call)]

    def check_messages(self, case, run):
        lines = run.messages.split("\n")[:-1]
        refusals = [line for line in lines if not line.startswith("warning: ")]
        warned = sorted({re.sub(r".*\[([a-z0-9-]+)\]$", r"\1", line) for line in lines if line.startswith("warning: ")})
        wrong = ["no message says %r" % word for word in case.words if word not in run.messages]
        wrong += ["not a message: %r" % line for line in lines if not MESSAGE.match(line) or re.search("[\x00-\x1f\x7f]", line)]
        if run.status == 1:
            wrong += [] if len(refusals) == 1 else ["%d refusals" % len(refusals)]
            wrong += ["something is on standard output"] if run.page else []
        if run.status == 0 and refusals:
            wrong.append("a refusal without a status")
        if run.status != case.exit:
            return wrong  # the caller says so, or it may be either
        if case.exit == 1:
            begin = FILE + ":" + (case.place + ": " if case.place else "")
            wrong += [] if refusals[:1] and refusals[0].startswith(begin) else ["the refusal is not at %s" % begin]
            wrong += [] if refusals[:1] and refusals[0].endswith("[%s]" % case.code) else ["the refusal is not [%s]" % case.code]
        if warned != sorted(case.warned):
            wrong.append("warnings %s, expected %s" % (warned, sorted(case.warned)))
        wrong += ["%d warnings" % len(lines)] if len(lines) > 12 * max(1, len(warned)) else []
        return wrong

    def check(self, case):
        """What is wrong with the run of a case: a list of sentences."""
        path = os.path.join(self.folder, FILE)
        case.write(path)
        run = Run([self.program, "check", FILE], self.folder, self.environment(case), case.stack)
        self.slowest = max(self.slowest, (run.seconds, case.name))
        self.largest = max(self.largest, (run.mebibytes, case.name))
        wrong = self.check_messages(case, run)
        if run.status not in ((0, 1) if case.exit is None else (case.exit,)):
            wrong.append("status %d, expected %s" % (run.status, "0 or 1" if case.exit is None else case.exit))
        if run.seconds > case.seconds * self.slack:
            wrong.append("%.1f seconds of processor time" % run.seconds)
        if run.mebibytes > case.mebibytes * self.slack:
            wrong.append("%.0f MiB" % run.mebibytes)
        if case.header:
            wrong += self.check_header(case)
        if case.sealed and self.has_strace:
            wrong += ["after the file it calls %s" % call for call in self.opened_after(case)]
        os.unlink(path)
        left = os.listdir(self.folder)
        wrong += ["left behind: %s" % left] if left else []
        return [sentence + "\n" + run.messages[:1500] for sentence in wrong[:1]] + wrong[1:]

    def check_header(self, case):
        """The names, as a table of records has them."""
        run = Run([self.program, "draw", FILE, "--records", "1", "-o", "-", "--quiet"], self.folder)
        if run.status != 0 and "no-tables" in run.messages:
            return []
        header = run.page.split("\n")[0].rstrip("\r")
        name = header[1:-1].replace('""', '"') if header.startswith('"') else header
        return [] if name == case.header else ["draw names the variables %r, not %r" % (header, case.header)]


def main():
    arguments = sys.argv[1:]
    slack = float(arguments.pop(arguments.index("--slack") + 1)) if "--slack" in arguments else 1.0
    arguments = [argument for argument in arguments if argument != "--slack"]
    trial = Trial()
    with tempfile.TemporaryDirectory() as folder:
        tester = Tester(arguments[0], slack, folder)
        for case in cases():
            if arguments[1:] and case.name not in arguments[1:]:
                continue
            wrong = tester.check(case)
            trial.check(not wrong, case.name, "; ".join(wrong))
    print("slowest: %.2f s, %s; largest: %.0f MiB, %s%s" % (tester.slowest + tester.largest + ("" if tester.has_strace else "; no strace",)))
    trial.finish()


if __name__ == "__main__":
    main()
