"""The whole review, files to files, against pyarrow's CSV writer on the same finished tables, in the same run.

    python -m tests.benchmarks.whole_review --tests 1000000

Prints seconds, the ratio, the peak memory of the review's process and the time per test at a tenth of the size.
"""

import argparse
import json
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import pyarrow.csv

from tests.benchmarks.cohorts import write_parquet_cohort

_RUN = """
import json, resource, sys, time
start = time.perf_counter()
from audiokit.cli.main import main
code = main(["review", sys.argv[1], "--out", sys.argv[2], "--age-correction"])
peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
print(json.dumps({"code": code, "seconds": time.perf_counter() - start, "peak_mb": peak / 1024}))
"""


def run_review(cohort: Path, out: Path) -> dict[str, float]:
    """One review in a process of its own: seconds from the first import to the last file, and the peak memory."""
    done = subprocess.run(
        [sys.executable, "-c", _RUN, str(cohort), str(out)], check=True, capture_output=True, text=True
    )
    figures: dict[str, float] = json.loads(done.stdout.splitlines()[-1])
    return figures


def write_again(out: Path, scratch: Path) -> float:
    """Seconds that pyarrow's CSV writer takes for the tables of a finished review, read back with their types."""
    seconds = 0.0
    for name in ("shifts", "events", "baselines", "worklist", "quality"):
        options = pyarrow.csv.ConvertOptions(strings_can_be_null=True)
        table = pyarrow.csv.read_csv(out / f"{name}.csv", convert_options=options)
        start = time.perf_counter()
        pyarrow.csv.write_csv(table, scratch / f"{name}.csv")
        seconds += time.perf_counter() - start
    return seconds


def measure(tests: int) -> dict[str, float]:
    """Figures of one size."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_parquet_cohort(folder / "cohort", tests)
        figures = run_review(folder / "cohort", folder / "out")
        (folder / "scratch").mkdir()
        figures["writer_seconds"] = write_again(folder / "out", folder / "scratch")
        figures["ratio"] = figures["seconds"] / figures["writer_seconds"]
        figures["csv_mb"] = sum(file.stat().st_size for file in (folder / "out").glob("*.csv")) / 1e6
        return figures


def main() -> None:
    """Print the figures."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--tests", type=int, nargs="+", default=[100_000, 1_000_000])
    for tests in parser.parse_args().tests:
        figures = measure(tests)
        print(f"{tests} tests: " + "  ".join(f"{name} {value:.2f}" for name, value in figures.items()))


if __name__ == "__main__":
    main()
