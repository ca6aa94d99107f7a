#!/usr/bin/env python3
"""Fault sweeps: the 1st, 2nd, 3rd ... allocation or system call fails, falls short or meets a signal, and the command either ends with
status 3 and a message, or does its work as if nothing had been; its outputs are as they were or complete; nothing is left behind."""
import errno
import random
import signal
import sys
import time

sys.dont_write_bytecode = True
from faultlib import Bench  # noqa: E402

# What each call may meet. "short" is half a read or write. Some of it must not even be noticed; of some calls no failure may be missed,
# and when it is the first of its kind, no output may have been touched yet.
UNNOTICED = {"EINTR", "short"}
NEVER_MISSED = {"write", "fsync", "fchmod", "linkat", "renameat", "close-written"}
BEFORE_ANYTHING = NEVER_MISSED - {"close-written"}
CALLS = {
    "open": ["EMFILE", "EINTR"],
    "openat": ["EMFILE", "ENOSPC", "EINTR"],
    "read": ["EIO", "EINTR", "short"],
    "write": ["ENOSPC", "EDQUOT", "EIO", "EINTR", "short"],
    "fsync": ["EIO", "ENOSPC", "EINTR"],
    "fchmod": ["EPERM", "EIO", "EINTR"],
    "linkat": ["EIO", "ENOSPC", "EINTR"],
    "renameat": ["EIO", "ENOSPC", "EINTR"],
    "close": ["EIO", "EINTR"],
    "close-written": ["EIO", "ENOSPC"],
}
SIGNALS = [signal.SIGINT, signal.SIGTERM, signal.SIGHUP, signal.SIGKILL]


class Sweep:
    """One command under one kind of fault."""

    def __init__(self, bench, command, wanted, what, environment, statuses, old=True, hidden=False, untouched=False):
        self.bench, self.command, self.wanted, self.what = bench, command, wanted, what
        self.environment, self.statuses, self.old, self.hidden, self.untouched = environment, statuses, old, hidden, untouched

    def try_one(self):
        result = self.bench.run(self.command, self.environment, self.old)
        return self.bench.judge(self.command, result, self.wanted, self.statuses, self.old, self.hidden, self.untouched)


def allocation_sweeps(bench, command, wanted):
    total = bench.count(command, "malloc_faults", {})
    for number in range(1, total + 2):
        for on in ("0", "1"):
            environment = {"LD_PRELOAD": bench.shim("malloc_faults"), "FAILN": str(number), "FAILON": on}
            what = f"{command.name}: allocation {number} of {total} fails{' and all behind it' if on == '1' else ''}"
            yield Sweep(bench, command, wanted, what, environment, {0, 3})


def call_variants(bench, command):
    """Every call of every kind that the command makes: with and without unnamed files, with and without an old file."""
    for call in CALLS:
        for no_tmpfile in ("0", "1"):
            for old in (True, False):
                environment = {"LD_PRELOAD": bench.shim("write_faults"), "FAULT_CALL": call, "NO_TMPFILE": no_tmpfile}
                for number in range(1, bench.count(command, "write_faults", environment, old) + 1):
                    what = f"{command.name}: {call} {number}{' (hidden names)' if no_tmpfile == '1' else ''}{'' if old else ' (new file)'}"
                    yield call, dict(environment, FAULT_AT=str(number)), old, what


def call_sweeps(bench, command, wanted):
    for call, environment, old, what in call_variants(bench, command):
        for error in CALLS[call]:
            fault = {"FAULT_SHORT": "1"} if error == "short" else {"FAULT_ERRNO": str(getattr(errno, error))}
            statuses = {0} if error in UNNOTICED else {3} if call in NEVER_MISSED else {0, 3}
            untouched = statuses == {3} and call in BEFORE_ANYTHING and environment["FAULT_AT"] == "1"
            yield Sweep(bench, command, wanted, f"{what}, {error}", dict(environment, **fault), statuses, old, untouched=untouched)


def signal_sweeps(bench, command, wanted):
    for call, environment, old, what in call_variants(bench, command):
        for number in SIGNALS:
            for after in ("0", "1"):
                fault = dict(environment, FAULT_SIGNAL=str(int(number)), FAULT_AFTER=after)
                name = f"{what}, {number.name} {'behind' if after == '1' else 'before'} it"
                yield Sweep(bench, command, wanted, name, fault, {-number}, old, hidden=number == signal.SIGKILL)


def thread_sweeps(bench, command, wanted):
    for number in (1, 2, 3):
        environment = {"LD_PRELOAD": bench.shim("thread_faults"), "THREADS_AT": str(number)}
        yield Sweep(bench, command, wanted, f"{command.name}: no thread from number {number} on", environment, {0})


def check_syncs(bench, command):
    """A file that gets a name is synced, and its folder after it."""
    for old in (True, False):
        syncs = bench.count(command, "write_faults", {"FAULT_CALL": "fsync"}, old)
        bench.note(f"{command.name}: syncs", "" if syncs == 2 * len(command.outputs) else f"{syncs} for {len(command.outputs)} outputs")


def try_all(bench, sweeps, seconds):
    """Tries sweeps until the time is up, in an order that meets every kind early; says how many were left out."""
    random.Random(1).shuffle(sweeps)
    end = time.monotonic() + seconds
    for start in range(0, len(sweeps), 16):
        if time.monotonic() > end and not bench.options.full:
            print(f"out of time: {len(sweeps) - start} of {len(sweeps)} such as \"{sweeps[start].what}\" were not tried", flush=True)
            break
        some = sweeps[start:start + 16]
        for sweep, complaint in zip(some, bench.pool.map(Sweep.try_one, some)):
            bench.note(sweep.what, complaint)


def main():
    with Bench(__doc__, in_memory=True) as bench:
        kinds = (thread_sweeps, call_sweeps, signal_sweeps, allocation_sweeps)
        todo = [(command, kind) for command in bench.commands() if not command.large for kind in kinds]
        end = time.monotonic() + bench.options.seconds
        for done, (command, kind) in enumerate(todo):
            wanted = bench.baseline(command)
            if kind is kinds[0]:
                check_syncs(bench, command)
            try_all(bench, list(kind(bench, command, wanted)), (end - time.monotonic()) / (len(todo) - done))
        return bench.end()


if __name__ == "__main__":
    sys.exit(main())
