"""Times a study stage by stage, with the peak memory: `python tests/benchmarks/study.py SIDECAR [--draws N]`.

For two versions of cellsim, run it in turns with PYTHONPATH set to one checkout and the other, and quote
the ratio: single times depend on what else the machine does.
"""

from __future__ import annotations

import argparse
import resource
import sys
import tempfile
import time
from pathlib import Path

import cellsim


def main() -> None:
    """Run the study some times and print the fastest time of each stage."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("sidecar", type=Path)
    parser.add_argument("--draws", type=int, default=None)
    parser.add_argument("--rounds", type=int, default=3)
    arguments = parser.parse_args()
    fastest: dict[str, float] = {}
    whole = float("inf")
    for _ in range(arguments.rounds):
        with tempfile.TemporaryDirectory() as folder:
            start = time.perf_counter()
            study = cellsim.open_study(arguments.sidecar)
            results = study.run(arguments.draws)
            begun = time.perf_counter()
            results.write(Path(folder) / "results.xlsx")
            written = time.perf_counter() - begun
            whole = min(whole, time.perf_counter() - start)
        record = results.records.record
        for stage, seconds in {**record.timings, "write": written}.items():
            fastest[stage] = min(seconds, fastest.get(stage, seconds))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / (
        1 if sys.platform == "darwin" else 1024
    )
    split = ", ".join(f"{stage} {seconds:.2f} s" for stage, seconds in fastest.items())
    print(f"{arguments.sidecar.name}: {record.draws:,} draws in {whole:.2f} s ({split})")
    print(f"peak memory {peak:,.0f} MB")
    for place, reason in record.slow_cells:
        print(f"slow: {place}: {reason}")


if __name__ == "__main__":
    main()
