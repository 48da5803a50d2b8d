"""Import of a large time record beside pandas reading the same file in chunks.

Both sides run in turn, each in a process of its own, so that their peak memory can be told; the
compressed copy of the original is not part of it.  Prints one line: the two medians, their
ratio, and the memory of the import over that of the program after its start.

    python tests/benchmarks/import_record.py [--small] [--rows N] [--rounds N]
"""

import argparse
import statistics
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np

_OURS = """
import resource, sys, time
import numpy, pandas
from benchlog.capture.read import inspect_captures
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
began = time.perf_counter()
inspect_captures([sys.argv[1]])
took = time.perf_counter() - began
print(took, (resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) / 1024)
"""
_BARE = """
import sys, time
import pandas as pd
began = time.perf_counter()
for chunk in pd.read_csv(sys.argv[1], chunksize=500_000):
    pass
print(time.perf_counter() - began, 0)
"""


def main() -> None:
    """Write a record, read it both ways, print one line."""
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--small", action="store_true", help="one round, 600,000 rows")
    options.add_argument("--rows", type=int, default=10_000_000)
    options.add_argument("--rounds", type=int, default=3)
    chosen = options.parse_args()
    rows = 600_000 if chosen.small else chosen.rows
    rounds = 1 if chosen.small else chosen.rounds
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "record.csv"
        _write(path, rows)
        ours, bare, memory = [], [], []
        for _ in range(rounds):
            took_s, grown_mb = _run(_OURS, path)
            ours.append(took_s)
            memory.append(grown_mb)
            bare.append(_run(_BARE, path)[0])
    print(  # noqa: T201 - a script's output
        f"import of {rows} rows: pandas in chunks {statistics.median(bare):.2f} s,"
        f" import {statistics.median(ours):.2f} s,"
        f" ratio {statistics.median(ours) / statistics.median(bare):.2f},"
        f" memory {max(memory):.0f} MB over the start"
    )


def _write(path: Path, rows: int) -> None:
    """Write an invented record of a board of gain 48 at 1 kHz."""
    random = np.random.default_rng(1)
    with path.open("w", encoding="utf-8") as file:
        file.write("Time (s),Input (V),Output (V)\n")
        for first in range(0, rows, 200_000):
            n = np.arange(first, min(first + 200_000, rows))
            angle = 2 * np.pi * 1e3 * n * 1e-7
            table = np.stack(
                [
                    n * 1e-7,
                    0.01 * np.cos(angle) + 1e-5 * random.standard_normal(n.size),
                    0.48 * np.cos(angle - 0.016) + 5e-4 * random.standard_normal(n.size),
                ],
                axis=1,
            )
            np.savetxt(file, table, fmt=["%.7e", "%.5e", "%.5e"], delimiter=",")


def _run(program: str, path: Path) -> tuple[float, float]:
    done = subprocess.run(
        [sys.executable, "-c", program, str(path)], capture_output=True, text=True, check=True
    )
    took_s, grown_mb = done.stdout.split()
    return float(took_s), float(grown_mb)


if __name__ == "__main__":
    main()
