#!/usr/bin/env python3
"""Signals at every stage of a run: it ends at once, by that signal, and leaves no half file.

usage: test_signals.py PROGRAM [TEST ...]
"""
import os
import random
import signal
import subprocess
import time

from bench import ProgramTest, SANITIZED, SECONDS, main

ENDING = (signal.SIGINT, signal.SIGTERM, signal.SIGHUP)
OLD = b"what stood here before\n"
AT_ONCE = 5 if SANITIZED else 1
SEED = 20240229


class Signals(ProgramTest):
    def end(self, process, number, may_be_done=False):
        """Sends a signal; the program ends by it, within a second. Whether it had ended by itself before."""
        begun = time.monotonic()
        process.send_signal(number)
        done = self.finish(process, status=None)
        self.assertLess(time.monotonic() - begun, AT_ONCE)
        if may_be_done and done.status == 0:
            return True
        self.assertEqual(done.status, 128 + number, done.err)
        self.assertEqual([line for line in done.err.splitlines() if not line.startswith(b"warning: ")], [])
        return False

    def wait_for(self, what, process):
        until = time.monotonic() + SECONDS
        while not what():
            self.assertIsNone(process.poll(), "the program ended early")
            self.assertLess(time.monotonic(), until)
            time.sleep(0.002)

    def has_open(self, process, name):
        folder = "/proc/%d/fd" % process.pid
        try:
            return any(os.path.realpath(os.path.join(folder, fd)).startswith(self.path(name)) for fd in os.listdir(folder))
        except FileNotFoundError:
            return False

    def test_waiting_for_the_network(self):
        os.mkfifo(self.path("fifo.xml"))
        for number in ENDING:
            process = self.start("fit", "fifo.xml", "cases.csv", "-o", "out.xml")
            writer = os.open(self.path("fifo.xml"), os.O_WRONLY)  # returns once the program reads
            os.write(writer, self.read("clinic.xml")[:1000])
            self.end(process, number)
            os.close(writer)
            self.assertFalse(os.path.exists(self.path("out.xml")))

    def test_waiting_for_the_table(self):
        """The outputs are open then, and nothing stands in their places yet."""
        self.write("out.xml", OLD)
        before = self.names()
        for number in ENDING:
            process = self.start("fit", "clinic.xml", "-", "-o", "out.xml", "--json", "out.json", stdin=subprocess.PIPE)
            process.stdin.write(self.read("cases.csv"))
            process.stdin.flush()
            self.wait_for(lambda: self.has_open(process, ""), process)
            self.end(process, number)
            self.assertEqual((self.names(), self.read("out.xml")), (before, OLD))

    def test_waiting_for_the_reader_of_an_output(self):
        os.mkfifo(self.path("fifo"))
        for number in ENDING:
            process = self.start("draw", "clinic.xml", "--records", "100000", "-o", "fifo")
            reader = os.open(self.path("fifo"), os.O_RDONLY)
            os.read(reader, 10)  # the rest stays in the pipe, which is full
            self.end(process, number)
            os.close(reader)

    def at_random_times(self, words, name, longest, times):
        self.ballast(*words)
        complete = self.read(name)
        random_times = random.Random(SEED)
        ended = 0
        for i in range(times):
            self.write(name, OLD)
            before = self.names()
            process = self.start(*words)
            wait = random_times.uniform(0, longest)
            time.sleep(wait)
            finished = self.end(process, ENDING[i % len(ENDING)], may_be_done=True)
            ended += finished
            told = "seed %d, run %d, after %.4f s" % (SEED, i, wait)
            self.assertEqual(self.names(), before, told)
            self.assertIn(self.read(name), (complete,) if finished else (OLD, complete), told)
        return ended

    def test_draw_at_random_times(self):
        self.at_random_times(["draw", "clinic.xml", "--records", "200000", "-o", "out.csv"], "out.csv", 0.2, 30)

    def test_fit_at_random_times(self):
        self.ballast("draw", "clinic.xml", "--records", "20000", "-o", "many.csv")
        words = ["fit", "clinic.xml", "many.csv", "-o", "out.xml", "--quiet", "--folds", "20", "--threads", "2", "--ess", "4"]
        self.at_random_times(words, "out.xml", 0.1, 30)

    def test_an_endless_draw(self):
        self.write("out.csv", OLD)
        before = self.names()
        for number in ENDING:
            process = self.start("draw", "clinic.xml", "--records", "1000000000000000", "-o", "out.csv")
            time.sleep(0.1)
            self.end(process, number)
            self.assertEqual((self.names(), self.read("out.csv")), (before, OLD))

    def test_twice(self):
        for first in ENDING:
            for second in ENDING:
                process = self.start("draw", "clinic.xml", "--records", "1000000000000000", "-o", "out.csv")
                self.wait_for(lambda: self.has_open(process, ""), process)
                process.send_signal(first)
                process.send_signal(second)
                done = self.finish(process, status=None)
                self.assertIn(done.status, (128 + first, 128 + second))
                self.assertFalse(os.path.exists(self.path("out.csv")))

    def test_many_threads(self):
        self.ballast("draw", "clinic.xml", "--records", "20000", "-o", "many.csv")
        for i, number in enumerate(ENDING * 3):
            process = self.start("fit", "clinic.xml", "many.csv", "--folds", "20000", "--threads", "8", "-o", "out.xml")
            time.sleep(0.05 + 0.01 * i)
            self.end(process, number)
            self.assertFalse(os.path.exists(self.path("out.xml")))

    def test_ignored_signals_stay_ignored(self):
        """As under nohup, and in the background of a shell."""
        def ignore():
            for number in ENDING:
                signal.signal(number, signal.SIG_IGN)

        process = self.start("draw", "clinic.xml", "--records", "50000", "-o", "-", preexec_fn=ignore)
        self.assertEqual(process.stdout.read(7), b"Season,")
        for number in ENDING:
            process.send_signal(number)
        done = self.finish(process)
        self.assertEqual(done.out.count(b"\n"), 50001)


if __name__ == "__main__":
    main()
