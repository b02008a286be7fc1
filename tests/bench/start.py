"""Seconds from the start of the program to the first prompt at a terminal, and to the result of a session without entries.

    cargo build --release
    python3 tests/bench/start.py [--rounds 20]
"""

import argparse
import os
import pty
import select
import statistics
import subprocess
import tempfile
import time


def to_prompt(binary, folder):
    """Starts the program in a pseudo-terminal and waits for `ket 1> `."""
    begin = time.perf_counter()
    pid, terminal = pty.fork()
    if pid == 0:
        os.environ.update(TERM="xterm", NO_COLOR="1", KETWORK_DATA=folder)
        os.execv(binary, [binary])
    seen = b""
    while b"ket 1> " not in seen:
        ready, _, _ = select.select([terminal], [], [], 10)
        if not ready:
            raise SystemExit(f"no prompt; seen: {seen!r}")
        seen += os.read(terminal, 4096)
    seconds = time.perf_counter() - begin
    os.write(terminal, b"quit\r")
    while select.select([terminal], [], [], 10)[0]:
        try:
            if not os.read(terminal, 4096):
                break
        except OSError:  # the other end is closed
            break
    os.waitpid(pid, 0)
    os.close(terminal)
    return seconds


def to_result(binary):
    begin = time.perf_counter()
    subprocess.run([binary, "run", "-"], input=b"ketwork session 1\n", stdout=subprocess.DEVNULL, check=True)
    return time.perf_counter() - begin


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--rounds", type=int, default=20)
    rounds = parser.parse_args().rounds
    binary = os.path.join(os.environ.get("CARGO_TARGET_DIR", "target"), "release/ketwork")
    with tempfile.TemporaryDirectory() as folder:
        prompts = [to_prompt(binary, folder) for _ in range(rounds)]
    results = [to_result(binary) for _ in range(rounds)]
    for name, seconds in (("first prompt", prompts), ("empty session", results)):
        print(f"{name}: least {min(seconds) * 1e3:.1f} ms, median {statistics.median(seconds) * 1e3:.1f} ms of {rounds} starts")


if __name__ == "__main__":
    main()
