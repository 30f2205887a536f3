"""How long a user waits who types the command once, and who imports the package.

A start is compared with a start: the whole command from the beginning of its process to the end, against
Python that only imports the libraries which any such program needs, in turns, fastest against fastest.
"""

from __future__ import annotations

import compileall
import os
import resource
import statistics
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tests.benchmarks.timing import in_turns, report, timed_by_clock

ROOT = Path(__file__).parents[2]
LIBRARIES = "import numpy, scipy.special, scipy.optimize, iminuit"
COMMAND = "from workbench.commands.main import main; raise SystemExit(main())"
ROUNDS = 7


@dataclass(frozen=True, slots=True)
class Start:
    """One run of Python from the start of its process to the end.

    Attributes:
        wall: by the clock [s].
        cpu: of the processor, by which a busy neighbour counts for less [s].
    """

    wall: float
    cpu: float


def run_python(*words: str) -> Start:
    """Run this Python from the repository; threads as a user has them, not as conftest.py sets them."""
    threads = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "PYTHONDONTWRITEBYTECODE")
    environment = {key: value for key, value in os.environ.items() if key not in threads}
    environment["PYTHONPATH"] = str(ROOT)
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    wall = timed_by_clock(
        lambda: subprocess.run(
            [sys.executable, *words], check=True, capture_output=True, cwd=ROOT, env=environment
        )
    )
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return Start(wall, after.ru_utime - before.ru_utime + after.ru_stime - before.ru_stime)


@pytest.fixture(scope="module", autouse=True)
def _compiled() -> None:
    """Write the byte code first, as installing does."""
    assert compileall.compile_dir(str(ROOT / "workbench"), quiet=2)


def beyond(benchmark: BenchmarkFixture, ours: tuple[str, ...], theirs: tuple[str, ...]) -> tuple[float, str]:
    """Return how much longer one start takes than another [s], and a line that tells all.

    The fastest rounds are compared, by the clock and by the processor; the smaller difference is returned:
    on a quiet machine the two agree.
    """
    run_python(*ours)
    run_python(*theirs)
    mine: list[Start] = []
    other: list[Start] = []
    in_turns(
        benchmark,
        lambda: mine.append(run_python(*ours)),
        lambda: other.append(run_python(*theirs)),
        ROUNDS,
    )
    walls = [[one.wall for one in starts] for starts in (mine, other)]
    cpus = [[one.cpu for one in starts] for starts in (mine, other)]
    by_clock = min(walls[0]) - min(walls[1])
    by_processor = min(cpus[0]) - min(cpus[1])
    middle = statistics.median(walls[0]) - statistics.median(walls[1])
    benchmark.extra_info["beyond the libraries [s]"] = round(by_clock, 3)
    line = (
        f"fastest {min(walls[0]):.2f} s against {min(walls[1]):.2f} s, beyond by {by_clock:.2f} s "
        f"(middle rounds {middle:.2f} s, processor {by_processor:.2f} s)"
    )
    return min(by_clock, by_processor), line


def test_weighing_skerry_cold_takes_at_most_a_second_and_a_half_beyond_its_libraries(
    benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    ours = ("-c", COMMAND, "weigh", "data/skerry/skerry.toml")
    longer, line = beyond(benchmark, ours, ("-c", LIBRARIES))
    report(capsys, f"oddsbench weigh data/skerry/skerry.toml: {line}; at most 1.5 s")
    assert longer <= 1.5


def test_importing_the_package_takes_at_most_150_ms_beyond_numpy(
    benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    longer, line = beyond(benchmark, ("-c", "import numpy, workbench"), ("-c", "import numpy"))
    report(capsys, f"import workbench: {line}; at most 0.15 s")
    assert longer <= 0.15
