#!/usr/bin/env python3
"""What `phase = "zero"` costs: time against one pass, and memory.

usage: both_ways.py [--rounds R] [--tool PATH]

Time: one recording of 10 minutes filtered as speed.toml says, causal and with phase
"zero", in alternating rounds (default 4) with one job; best times and their ratio.
Memory: the same recording against one of an hour, with phase "zero".
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
        spec = folder / "zero.toml"
        spec.write_text('phase = "zero"\n' + timing.SPEC.read_text())
        specs = {"causal": timing.SPEC, "zero": spec}
        for name, seconds in [("hour", 3600), ("long", 600)]:
            timing.make_recordings(folder / name, 1, seconds)

        def run(name, phase):
            return timing.run_tool(folder / name, folder / "out", 1, options.tool, specs[phase])

        best, peak = {}, {}
        for _ in range(options.rounds):
            for phase in specs:
                seconds, memory = run("long", phase)
                best[phase] = min(seconds, best.get(phase, seconds))
                peak[phase] = max(memory, peak.get(phase, memory))
        print(
            f"10 minutes: causal {best['causal']:.2f} s, zero {best['zero']:.2f} s, "
            f"ratio {best['zero'] / best['causal']:.2f}"
        )
        hour = run("hour", "zero")[1]
        print(
            f"peak memory: causal {peak['causal']:.1f} MiB, zero {peak['zero']:.1f} MiB, zero over an hour {hour:.1f} MiB, "
            f"ratio {hour / peak['zero']:.3f}"
        )


if __name__ == "__main__":
    main()
