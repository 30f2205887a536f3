"""Workers go when the kernel that started them is gone, however it went."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

from tests.widgets.jobs.test_blocks import is_gone

ROOT = Path(__file__).parents[3]
KERNEL = """
import time
from tests.widgets.jobs.slow_blocks import busy
from workbench.widgets.jobs.workers import Workers
if __name__ == "__main__":
    workers = Workers(1)
    print(workers.submit(busy, 0.0).result().result, flush=True)
    workers.submit(busy, 600.0)
    time.sleep(600.0)
"""


def test_a_worker_does_not_outlive_a_kernel_that_was_killed(tmp_path: Path) -> None:
    """Pools of processes left workers behind that computed to the end for nobody."""
    script = tmp_path / "kernel.py"
    script.write_text(KERNEL)
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    with subprocess.Popen([sys.executable, script], stdout=subprocess.PIPE, env=environment) as kernel:
        assert kernel.stdout is not None
        worker = int(kernel.stdout.readline())
        time.sleep(0.3)
        assert not is_gone(worker)
        kernel.send_signal(signal.SIGKILL)
        kernel.wait()
    end = time.monotonic() + 5.0
    while not is_gone(worker):
        assert time.monotonic() < end, "the worker is still there"
        time.sleep(0.05)
