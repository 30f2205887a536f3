"""The published values, one test a value."""

from __future__ import annotations

import functools
import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest


@dataclass(frozen=True)
class Printed:
    """A number that somebody printed, or an identity, with what to compute."""

    name: str
    topic: str
    method: str
    inputs: dict[str, Any]
    value: float
    precision: float
    relation: str
    recomputed: float | None
    source: str
    known_by: str

    def check(self, computed: float) -> None:
        """Fail unless a computed number lands on the printed one, and on its sharper recomputation."""
        origin = (
            f"{self.name}: computed {computed!r}, printed {self.value!r} in {self.source} ({self.known_by})"
        )
        if self.relation == "upper bound":
            assert computed < self.value, origin
        else:
            # Printed numbers are rounded or cut off: they may be one unit of their last digit away, no more.
            assert abs(computed - self.value) <= self.precision * (1.0 + 1e-9), origin
        if self.recomputed is not None and self.relation != "identity":
            assert computed == pytest.approx(self.recomputed, rel=2e-9, abs=1e-11), origin


TAKEN: set[str] = set()
"""Names of the values that some test has asked for."""


@functools.cache
def every_value() -> tuple[Printed, ...]:
    """Read all of them."""
    text = (Path(__file__).parent / "values.toml").read_text(encoding="utf-8")
    return tuple(
        Printed(
            name=entry["id"],
            topic=entry["topic"],
            method=entry["method"],
            inputs=entry.get("inputs", {}),
            value=entry["value"],
            precision=entry["printed_precision"],
            relation=entry.get("relation", "value"),
            recomputed=entry.get("recomputed"),
            source=f"{entry['source']}, {entry['where']}",
            known_by=entry["known_by"],
        )
        for entry in tomllib.loads(text)["value"]
    )


def of_topic(topic: str, *starts: str) -> pytest.MarkDecorator:
    """Give a test every value of a topic as `printed`, or those whose names start so."""
    chosen = [
        value
        for value in every_value()
        if value.topic == topic and (not starts or value.name.startswith(starts))
    ]
    TAKEN.update(value.name for value in chosen)
    return pytest.mark.parametrize("printed", chosen, ids=[value.name for value in chosen])
