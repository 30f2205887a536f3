"""How long a user waits who types the command once, and who imports the package.

A start is compared with a start: the whole command from the beginning of its process to the end, against
Python that only imports the libraries which any such program needs, in turns, fastest against fastest.
"""

from __future__ import annotations

import compileall
import os
import statistics
import subprocess
import sys
from pathlib import Path

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tests.benchmarks.timing import in_turns, report, timed

ROOT = Path(__file__).parents[2]
LIBRARIES = "import numpy, scipy.special, scipy.optimize, iminuit"
COMMAND = "from workbench.commands.main import main; raise SystemExit(main())"
ROUNDS = 7


def run_python(*words: str) -> None:
    """Run this Python from the repository; threads as a user has them, not as conftest.py sets them."""
    threads = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "PYTHONDONTWRITEBYTECODE")
    environment = {key: value for key, value in os.environ.items() if key not in threads}
    environment["PYTHONPATH"] = str(ROOT)
    subprocess.run([sys.executable, *words], check=True, capture_output=True, cwd=ROOT, env=environment)


@pytest.fixture(scope="module", autouse=True)
def _compiled() -> None:
    """Write the byte code first, as installing does."""
    assert compileall.compile_dir(str(ROOT / "workbench"), quiet=2)


def beyond(
    benchmark: BenchmarkFixture, ours: tuple[str, ...], theirs: tuple[str, ...]
) -> tuple[float, float, str]:
    """Return how much longer one start takes than another, by fastest and middle rounds [s], and a line."""
    run_python(*ours)
    run_python(*theirs)
    mine: list[float] = []
    other: list[float] = []
    in_turns(
        benchmark,
        lambda: mine.append(timed(lambda: run_python(*ours))),
        lambda: other.append(timed(lambda: run_python(*theirs))),
        ROUNDS,
    )
    fastest = min(mine) - min(other)
    middle = statistics.median(mine) - statistics.median(other)
    benchmark.extra_info["beyond the libraries [s]"] = round(fastest, 3)
    line = (
        f"fastest {min(mine):.2f} s against {min(other):.2f} s, beyond by {fastest:.2f} s "
        f"(by middle rounds {middle:.2f} s)"
    )
    return fastest, middle, line


def test_weighing_skerry_cold_takes_at_most_a_second_and_a_half_beyond_its_libraries(
    benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    ours = ("-c", COMMAND, "weigh", "data/skerry/skerry.toml")
    fastest, middle, line = beyond(benchmark, ours, ("-c", LIBRARIES))
    report(capsys, f"oddsbench weigh data/skerry/skerry.toml: {line}; at most 1.5 s")
    assert min(fastest, middle) <= 1.5


def test_importing_the_package_takes_at_most_150_ms_beyond_numpy(
    benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    fastest, middle, line = beyond(benchmark, ("-c", "import numpy, workbench"), ("-c", "import numpy"))
    report(capsys, f"import workbench: {line}; at most 0.15 s")
    assert min(fastest, middle) <= 0.15
