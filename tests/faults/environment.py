#!/usr/bin/env python3
"""Bad surroundings: full disks, closed descriptors, folders that may not be written, readers that leave, limits, signals at any time,
two runs at once. Whatever happens, outputs are as they were or complete, and nothing is left behind."""
import os
import pathlib
import random
import resource
import shutil
import signal
import stat
import subprocess
import sys
import threading
import time

sys.dont_write_bytecode = True
from faultlib import OLD, Bench, Result, thin  # noqa: E402

ALONE = []  # whether a mount of our own is possible, and how: filled by can_mount()


def can_mount():
    if not ALONE:
        for words in (["unshare", "-m"], ["unshare", "-Urm"]):
            if shutil.which("unshare") and subprocess.run(words + ["true"], capture_output=True).returncode == 0:
                ALONE.append(words)
                break
        else:
            ALONE.append(None)
    return ALONE[0]


def run_on_mount(bench, command, prepare):
    """Runs a command in a mount namespace where `prepare` has made its folder $D, and looks at what the folder holds then."""
    folder, kept = bench.folder(command, False), bench.folder(command, False)
    script = (f"set -e; D='{folder}'; K='{kept}'; {prepare}\n"
              'set +e; "$@"; s=$?; cp -p "$D"/* "$D"/.ballast-* "$K"/ 2>/dev/null; exit $s')
    done = subprocess.run(can_mount() + ["sh", "-c", script, "sh"] + bench.words(command, folder), capture_output=True,
                          stdin=subprocess.DEVNULL, timeout=60, env=dict(os.environ, LC_ALL="C"))
    files = {p.name: p.read_bytes() for p in kept.iterdir() if p.name != "filler"}
    shutil.rmtree(folder)
    shutil.rmtree(kept)
    return Result(done.returncode, done.stdout, done.stderr, files)


def mounts(bench, command, wanted):
    olds = "".join(f"printf '%s' '{OLD.decode()}' > $D/{name}; " for name in command.outputs)
    fill = "dd if=/dev/zero of=$D/filler bs=1k 2>/dev/null || true"
    places = [
        ("a full file system of 64 KiB", f"mount -t tmpfs -o size=64k tmpfs $D; {olds} {fill}"),
        ("no inode left", f"mount -t tmpfs -o nr_inodes={len(command.outputs) + 1} tmpfs $D; {olds}"),
        ("a read-only mount", f"{olds} mount --bind $D $D; mount -o remount,ro,bind $D"),
    ]
    if command.large:
        places = [("a file system of 64 KiB", f"mount -t tmpfs -o size=64k tmpfs $D; {olds}")]
    for what, prepare in places:
        if not can_mount():
            bench.skip(f"{command.name}: {what}", "no mount namespace can be made here")
            continue
        result = run_on_mount(bench, command, prepare)
        bench.note(f"{command.name}: {what}", bench.judge(command, result, wanted, {3}))


def standard_output(bench, command, wanted):
    """Whoever prints must notice that nobody got it; whoever does not, has nothing to notice."""
    statuses = {3} if wanted.stdout else {0}
    with open("/dev/full", "wb") as full:
        result = bench.run(command, stdout=full)
        result.stdout = wanted.stdout
        bench.note(f"{command.name}: standard output is full", bench.judge(command, result, wanted, statuses))
    for ignored in (False, True):
        reading, writing = os.pipe()
        os.close(reading)
        act = signal.SIG_IGN if ignored else signal.SIG_DFL
        result = bench.run(command, stdout=writing, restore_signals=False, preexec_fn=lambda act=act: signal.signal(signal.SIGPIPE, act))
        os.close(writing)
        result.stdout = wanted.stdout
        allowed = {0} if not wanted.stdout else {3} if ignored else {3, -signal.SIGPIPE}
        what = f"{command.name}: the reader has left, SIGPIPE {'ignored' if ignored else 'as usual'}"
        bench.note(what, bench.judge(command, result, wanted, allowed))


def closed_descriptors(bench, command, wanted):
    for closed in range(8):
        def close(closed=closed):
            for descriptor in range(3):
                if closed >> descriptor & 1:
                    os.close(descriptor)
        result = bench.run(command, preexec_fn=close)
        says = bool(wanted.stdout) and closed & 2
        if closed & 2:
            result.stdout = wanted.stdout
        if closed & 4 and says:
            result.stderr = b"[cannot be seen]"
        what = f"{command.name}: descriptors {[d for d in range(3) if closed >> d & 1]} closed"
        bench.note(what, bench.judge(command, result, wanted, {3} if says else {0}))


def limits(bench, command, wanted):
    def limit(which, amount):
        return lambda: resource.setrlimit(which, (amount, amount))
    cases = [
        ("files of at most 100 bytes", limit(resource.RLIMIT_FSIZE, 100), {3}),
        ("8 descriptors", limit(resource.RLIMIT_NOFILE, 8), {0, 3}),
        ("5 descriptors", limit(resource.RLIMIT_NOFILE, 5), {0, 3}),
        ("200 MB of address space", limit(resource.RLIMIT_AS, 200 << 20), {0, 3}),
        ("a stack of 64 KiB", limit(resource.RLIMIT_STACK, 64 << 10), {0, 3}),
    ]
    for what, before, statuses in cases:
        bench.note(f"{command.name}: {what}", bench.judge(command, bench.run(command, preexec_fn=before), wanted, statuses))


def permissions(bench, command, wanted):
    """As an ordinary user, since root may do anything."""
    as_user = ["setpriv", "--reuid=65534", "--regid=65534", "--clear-groups"] if os.geteuid() == 0 else []
    can_be_one = not as_user or shutil.which("setpriv")
    if not can_be_one or subprocess.run(as_user + ["test", "-x", command.words[0]], capture_output=True).returncode != 0:
        bench.skip(f"{command.name}: permissions", "an ordinary user cannot reach the program, or there is no setpriv")
        return
    for what, folder_mode, file_mode, statuses in (("a read-only folder", 0o555, 0o666, {3}), ("read-only files", 0o777, 0o444, {3}),
                                                   ("files of somebody else that may be written", 0o777, 0o666, {0})):
        folder = bench.folder(command)
        for name in command.outputs:
            (folder / name).chmod(file_mode)
        folder.chmod(folder_mode)
        result = bench.run_in(folder, as_user + bench.words(command, folder))
        bench.note(f"{command.name}: {what}", bench.judge(command, result, wanted, statuses))
        folder.chmod(0o755)
        shutil.rmtree(folder)


def immutable_files(bench, command, wanted):
    folder = bench.folder(command)
    paths = [str(folder / name) for name in command.outputs]
    if not shutil.which("chattr") or subprocess.run(["chattr", "+i"] + paths, capture_output=True).returncode != 0:
        bench.skip(f"{command.name}: files that cannot be changed", "chattr +i is not possible here")
    else:
        result = bench.run_in(folder, bench.words(command, folder))
        bench.note(f"{command.name}: files that cannot be changed", bench.judge(command, result, wanted, {3}))
        subprocess.run(["chattr", "-i"] + paths, check=True)
    shutil.rmtree(folder)


def kinds_of_file(bench, command, wanted):
    """Links stay links, modes stay modes, new files follow the umask, what is no file is written in place."""
    folder = bench.folder(command)
    for name in command.outputs:
        (folder / name).rename(folder / ("real " + name))
        (folder / ("real " + name)).chmod(0o640)
        (folder / name).symlink_to("real " + name)
    result = bench.run_in(folder, bench.words(command, folder))
    complaint = ""
    for name in command.outputs:
        real = folder / ("real " + name)
        if not (folder / name).is_symlink() or stat.S_IMODE(real.stat().st_mode) != 0o640 or real.read_bytes() != wanted.files[name]:
            complaint = f"{name}: the link, the mode or the bytes are wrong"
    bench.note(f"{command.name}: links and modes", complaint or (f"status {result.status}" if result.status else ""))
    shutil.rmtree(folder)

    folder = bench.folder(command, False)
    result = bench.run_in(folder, bench.words(command, folder), preexec_fn=lambda: os.umask(0o077))
    complaint = bench.judge(command, result, wanted, {0}, False)
    if not complaint and any(stat.S_IMODE((folder / name).stat().st_mode) != 0o600 for name in command.outputs):
        complaint = "a new file does not follow the umask"
    bench.note(f"{command.name}: umask 077", complaint)
    shutil.rmtree(folder)

    for device, status in (("/dev/null", 0), ("/dev/full", 3)):
        folder = bench.folder(command, False)
        link = folder / command.outputs[0]
        link.symlink_to(device)
        result = bench.run_in(folder, bench.words(command, folder))
        kept = link.is_symlink() and pathlib.Path(device).is_char_device()
        complaint = "" if result.status == status and kept else f"status {result.status}, link and device kept: {kept}"
        bench.note(f"{command.name}: {device}", complaint)
        shutil.rmtree(folder)


def hidden_names(bench, command, wanted):
    """Where there are no unnamed files: a hidden one is closed to others while it is written, and modes come out the same."""
    for mode, umask, kept in ((0o600, 0o022, 0o600), (0o664, 0o077, 0o664), (None, 0o027, 0o640)):
        folder = bench.folder(command, mode is not None)
        for name in command.outputs if mode is not None else []:
            (folder / name).chmod(mode)
        shim = {"LD_PRELOAD": bench.shim("write_faults"), "NO_TMPFILE": "1"}
        killed = dict(shim, FAULT_CALL="write", FAULT_AT="1", FAULT_SIGNAL=str(int(signal.SIGKILL)))
        result = bench.run_in(folder, bench.words(command, folder), killed, preexec_fn=lambda umask=umask: os.umask(umask))
        complaint = bench.judge(command, result, wanted, {-signal.SIGKILL}, mode is not None, hidden=True, untouched=True)
        hidden = [path for path in folder.iterdir() if path.name.startswith(".ballast-")]
        for path in hidden:
            if mode is not None and stat.S_IMODE(path.stat().st_mode) & 0o077:
                complaint = complaint or "a hidden file was open to others"
            path.unlink()
        result = bench.run_in(folder, bench.words(command, folder), shim, preexec_fn=lambda umask=umask: os.umask(umask))
        complaint = complaint or ("" if hidden else "there was no hidden file") or bench.judge(command, result, wanted, {0})
        modes = [stat.S_IMODE((folder / name).stat().st_mode) for name in command.outputs]
        complaint = complaint or ("" if set(modes) == {kept} else f"modes {[oct(m) for m in modes]}, not {oct(kept)}")
        bench.note(f"{command.name}: hidden names, mode {oct(mode) if mode is not None else 'new'}", complaint)
        shutil.rmtree(folder)


def fifos(bench, command, wanted):
    folder = bench.folder(command, False)
    got = {}

    def read(name):
        got[name] = (folder / name).read_bytes()
    for name in command.outputs:
        os.mkfifo(folder / name)
    readers = [threading.Thread(target=read, args=(name,), daemon=True) for name in command.outputs]
    for reader in readers:
        reader.start()
    result = bench.run_in(folder, bench.words(command, folder))
    for reader in readers:
        reader.join(10)
    right = result.status == 0 and all(got.get(name) == wanted.files[name] for name in command.outputs)
    bench.note(f"{command.name}: FIFOs", "" if right else f"status {result.status}, or the bytes differ")
    shutil.rmtree(folder)


def two_at_once(bench, command, wanted):
    for turn in range(5):
        folder = bench.folder(command, turn % 2 == 0)
        both = [subprocess.Popen(bench.words(command, folder), stdout=subprocess.DEVNULL, stderr=subprocess.PIPE) for _ in range(2)]
        statuses = [process.wait(60) for process in both]
        for process in both:
            process.stderr.close()
        files = {p.name: p.read_bytes() for p in folder.iterdir()}
        complaint = "" if statuses == [0, 0] else f"statuses {statuses}"
        bench.note(f"{command.name}: two at once", complaint or bench.judge(command, Result(0, wanted.stdout, b"", files), wanted, {0}))
        shutil.rmtree(folder)


def signals_at_random(bench, command, wanted):
    chance = random.Random(1)
    start = time.monotonic()
    bench.run(command)
    length = time.monotonic() - start
    for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP, signal.SIGKILL):
        for turn in range(200 if bench.options.full else 12):
            folder, wait = bench.folder(command), chance.uniform(0, 1.2 * length)
            process = subprocess.Popen(bench.words(command, folder), stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)
            time.sleep(wait)
            process.send_signal(number)
            if turn % 3 == 0 and number != signal.SIGKILL:
                process.send_signal(number)  # an impatient user
            try:
                status = process.wait(1)
            except subprocess.TimeoutExpired:
                process.kill()
                status = process.wait()
            files = {p.name: p.read_bytes() for p in folder.iterdir()}
            result = Result(status, wanted.stdout, process.stderr.read(), files)
            process.stderr.close()
            complaint = bench.judge(command, result, wanted, {0, -number}, hidden=number == signal.SIGKILL)
            bench.note(f"{command.name}: {number.name} after {wait * 1000:.1f} ms", complaint)
            shutil.rmtree(folder)


def kills_at_every_call(bench, command, wanted):
    """By strace, which also meets the calls that the C library makes on its own."""
    if not shutil.which("strace"):
        bench.skip(f"{command.name}: killed at every system call", "there is no strace")
        return
    trace = bench.scratch / "trace"
    folder = bench.folder(command)
    subprocess.run(["strace", "-f", "-c", "-o", str(trace)] + bench.words(command, folder), capture_output=True, check=True)
    shutil.rmtree(folder)
    rows = [line.split() for line in trace.read_text().splitlines()[2:]]
    counts = {row[-1]: int(row[3]) for row in rows if len(row) >= 5 and row[-1] not in ("total", "execve") and row[3].isdigit()}
    places = [(call, number) for call in sorted(counts) for number in range(1, counts[call] + 1)]
    for call, number in places if bench.options.full else thin(places, 10):
        folder = bench.folder(command)
        words = ["strace", "-f", "-o", "/dev/null", "-e", f"trace={call}", "-e", f"inject={call}:signal=KILL:when={number}"]
        result = bench.run_in(folder, words + bench.words(command, folder))
        complaint = bench.judge(command, result, wanted, {-signal.SIGKILL, 0, 128 + signal.SIGKILL}, hidden=True)
        bench.note(f"{command.name}: killed at {call} {number}", complaint)
        shutil.rmtree(folder)


def main():
    with Bench(__doc__) as bench:
        trials = [mounts, standard_output, closed_descriptors, limits, permissions, immutable_files, kinds_of_file, hidden_names,
                  fifos, two_at_once, signals_at_random]
        few, printing = [mounts, limits, signals_at_random], [standard_output, closed_descriptors]
        if bench.options.full:
            trials.append(kills_at_every_call)
        for command in bench.commands():
            wanted = bench.baseline(command)
            for trial in few if command.large else trials if command.outputs else printing:
                trial(bench, command, wanted)
        return bench.end()


if __name__ == "__main__":
    sys.exit(main())
