"""How far a piece of work is, and how long it will still take."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Progress:
    """How far a piece of work is.

    Attributes:
        done: blocks finished.
        total: blocks in all; at least 1.
        seconds: since it began [s].
        expected: what it took the last time [s], where known.
    """

    done: int
    total: int
    seconds: float
    expected: float | None = None

    @property
    def share(self) -> float:
        """Return the finished part, from 0 to 1; by the clock where no block is finished yet."""
        by_clock = min(self.seconds / self.expected, 0.95) if self.expected else 0.0
        return max(self.done / self.total, by_clock if self.done == 0 else 0.0)

    @property
    def remaining(self) -> float | None:
        """Return an estimate of the time left [s], or None where nothing tells."""
        if self.done:
            return self.seconds * (self.total - self.done) / self.done
        return max(self.expected - self.seconds, 0.0) if self.expected else None

    def text(self) -> str:
        """Return the progress in words."""
        left = self.remaining
        if left is None:
            return f"for {duration(self.seconds)}"
        return f"{100.0 * self.share:.0f} %, about {duration(left)} left"


def duration(seconds: float) -> str:
    """Return a time in words, no finer than anyone needs while waiting."""
    if seconds < 1.0:
        return "1 s"
    if seconds < 90.0:
        return f"{seconds:.0f} s"
    return f"{seconds / 60.0:.0f} min" if seconds < 5400.0 else f"{seconds / 3600.0:.1f} h"
