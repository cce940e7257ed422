#!/usr/bin/env python3
"""Peak memory for long recordings, and what a second core gains.

usage: memory_and_cores.py [--rounds R] [--tool PATH]

Memory: one recording of 10 minutes and one of an hour, at the same segment length
(the spec's narrowest band sets it); it must not grow with the recording.
Cores: one recording of 10 minutes, and six of 100 seconds, with 1 and 2 jobs in
alternating rounds (default 4); best times. One long recording should gain as much
from a second core as several.
Build first: cargo build --release
"""
import argparse
import tempfile
from pathlib import Path

import timing


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--rounds", type=int, default=4)
    parser.add_argument("--tool", type=Path, default=timing.TOOL)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        folder = Path(folder)
        for name, count, seconds in [("hour", 1, 3600), ("long", 1, 600), ("six", 6, 100)]:
            timing.make_recordings(folder / name, count, seconds)

        def run(name, jobs):
            return timing.run_tool(folder / name, folder / "out", jobs, options.tool)

        for jobs in (1, 2):
            short, hour = (max(run(name, jobs)[1] for _ in range(2)) for name in ("long", "hour"))
            print(f"peak memory, {jobs} job(s): 10 minutes {short:.1f} MiB, 1 hour {hour:.1f} MiB, ratio {hour / short:.3f}")
        best = {}
        for _ in range(options.rounds):
            for name in ("long", "six"):
                for jobs in (1, 2):
                    seconds = run(name, jobs)[0]
                    best[name, jobs] = min(seconds, best.get((name, jobs), seconds))
        gains = {name: best[name, 1] / best[name, 2] for name in ("long", "six")}
        for name, text in [("long", "one recording of 10 minutes"), ("six", "six recordings of 100 s")]:
            print(f"{text}: 1 job {best[name, 1]:.2f} s, 2 jobs {best[name, 2]:.2f} s, gain {gains[name]:.2f}")
        print(f"gain of the one against gain of the six: {gains['long'] / gains['six']:.2f}")


if __name__ == "__main__":
    main()
