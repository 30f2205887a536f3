"""Saved updating ratios: read back as they were, refused where anything in them was changed."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.records import hand_built as hand
from tests.records import hand_scans as scans
from workbench.errors import InputError
from workbench.evidence.ratio.results import Scan
from workbench.hypotheses.priors import Exponential, Normal, Prior, Uniform
from workbench.records.files import record_text, write_record
from workbench.records.fit_record import fit_record
from workbench.records.reading_record import reading_record
from workbench.records.scan_reading import read_saved_scan, read_scan
from workbench.records.scan_record import scan_record

Change = Callable[[dict[str, Any]], object]


def written(found: Scan, folder: Path) -> Path:
    path = folder / "scan.json"
    write_record(scan_record(scans.outcome(found)), path)
    return path


def changed(folder: Path, change: Change) -> Path:
    path = written(scans.scan(), folder)
    record = json.loads(path.read_text(encoding="utf-8"))
    change(record)
    path.write_text(json.dumps(record), encoding="utf-8")
    return path


@pytest.mark.parametrize("made", [scans.scan, scans.over_mass, scans.over_strength, scans.unestablished])
def test_a_scan_read_back_is_the_scan(made: Callable[[], Scan], tmp_path: Path) -> None:
    given = made()
    found = read_scan(written(given, tmp_path))
    for name in ("hypothesis", "against", "over", "priors", "averaged", "prior_odds", "is_nested", "checks"):
        assert getattr(found, name) == getattr(given, name), name
    for name in ("established", "reason", "seed", "draws", "ln_bayes_factor", "ln_bayes_factor_error"):
        assert getattr(found, name) == getattr(given, name), name
    assert found.known.names == given.known.names
    np.testing.assert_allclose(found.known.ln_ratio, given.known.ln_ratio, atol=1e-7)
    np.testing.assert_allclose(found.known.nodes, given.known.nodes, rtol=1e-9)
    assert found.reprior().ln_bayes_factor == pytest.approx(given.reprior().ln_bayes_factor, abs=1e-6)


def test_priors_on_the_saved_scan_give_what_they_give_on_the_scan(tmp_path: Path) -> None:
    given, saved = scans.scan(), read_scan(written(scans.scan(), tmp_path))
    choices: list[dict[str, Prior]] = [
        {"strength": Exponential(1.0)},
        {"mass": Normal(46.0, 2.0), "strength": Uniform(0.0, 8.0)},
        scans.at(1.5, 46.3),
    ]
    for priors in choices:
        before, after = given.reprior(priors), saved.reprior(priors)
        assert after.ln_bayes_factor == pytest.approx(before.ln_bayes_factor, abs=1e-6)
        assert after.error == pytest.approx(before.error, rel=1e-3)
    assert saved.reprior(scans.at(1.5, 46.3)).ln_bayes_factor == pytest.approx(scans.DEPTH, abs=0.01)


def test_a_scan_without_a_surface_is_kept_with_its_reason(tmp_path: Path) -> None:
    saved = read_scan(written(scans.nowhere(), tmp_path))
    assert saved.surface is None
    with pytest.raises(InputError, match="R is known nowhere"):
        saved.reprior()


def test_the_layout_of_the_file_has_no_share_in_its_digest(tmp_path: Path) -> None:
    path = written(scans.scan(), tmp_path)
    record = json.loads(path.read_text(encoding="utf-8"))
    path.write_text(json.dumps(record, sort_keys=True, indent=4), encoding="utf-8")
    assert read_saved_scan(path).digest == record["digest"]


CHANGES: dict[str, Change] = {
    "a ratio": lambda record: record["surface"]["ln_ratio"][3].__setitem__(2, 1.0),
    "an error": lambda record: record["surface"]["error"][3].__setitem__(2, 0.0),
    "a node": lambda record: record["surface"]["strengths"]["nodes"][0].__setitem__(1, 0.01),
    "an edge": lambda record: record["surface"]["panels"][0]["edges"].__setitem__(0, 10.0),
    "an end": lambda record: record["surface"]["strengths"].__setitem__("high", 100.0),
    "the prior odds": lambda record: record.__setitem__("prior_odds", 50.0),
    "whether it is established": lambda record: record.__setitem__("established", False),
    "a stated prior": lambda record: record["priors"]["mass"]["prior"]["uniform"].__setitem__("high", 50.0),
    "a name": lambda record: record.__setitem__("hypothesis", "another"),
    "a new key": lambda record: record.__setitem__("note", "looked at"),
}


@pytest.mark.parametrize("what", CHANGES)
def test_a_record_with_anything_changed_is_refused(what: str, tmp_path: Path) -> None:
    path = changed(tmp_path, CHANGES[what])
    with pytest.raises(InputError) as caught:
        read_scan(path)
    (problem,) = caught.value.problems
    assert problem.what == "A record that was changed after it was written"
    assert "oddsbench scan FILE" in problem.remedy


GARBAGE: dict[str, Change] = {
    "without its surface": lambda record: record.pop("surface"),
    "with a surface that is a text": lambda record: record.__setitem__("surface", "smooth"),
    "with a row too short": lambda record: record["surface"]["ln_ratio"][0].pop(),
    "with words for numbers": lambda record: record["surface"]["error"][0].__setitem__(0, "small"),
    "with a gap": lambda record: record["surface"]["ln_ratio"][0].__setitem__(0, None),
    "without a digest": lambda record: record.pop("digest"),
    "with an unknown family": lambda record: record["priors"]["mass"].__setitem__("prior", {"flat": {}}),
}


@pytest.mark.parametrize("what", GARBAGE)
def test_garbage_is_refused_without_a_fault(what: str, tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        read_scan(changed(tmp_path, GARBAGE[what]))
    (problem,) = caught.value.problems
    assert problem.what.startswith("A record")
    assert "scan.json" in problem.where


def test_every_part_left_out_of_a_record_is_noticed(tmp_path: Path) -> None:
    path = written(scans.scan(), tmp_path)
    whole = json.loads(path.read_text(encoding="utf-8"))
    for key in whole:
        less = copy.deepcopy(whole)
        del less[key]
        path.write_text(json.dumps(less), encoding="utf-8")
        with pytest.raises(InputError):
            read_scan(path)


def test_a_text_cut_short_is_refused(tmp_path: Path) -> None:
    path = written(scans.scan(), tmp_path)
    text = path.read_text(encoding="utf-8")
    for share in (0.0, 0.1, 0.5, 0.99):
        path.write_text(text[: int(share * len(text))], encoding="utf-8")
        with pytest.raises(InputError):
            read_scan(path)


def test_a_record_of_another_command_is_refused_by_its_name(tmp_path: Path) -> None:
    path = tmp_path / "fit.json"
    write_record(fit_record(hand.fitted()), path)
    with pytest.raises(InputError) as caught:
        read_scan(path)
    (problem,) = caught.value.problems
    assert (problem.what, problem.found) == ("A record of another kind", 'a record of "fit"')
    assert problem.expected == 'a record of "scan"'


def test_a_row_of_numbers_stands_on_one_line_and_texts_stay_as_they_are() -> None:
    record = {"rows": [[1.5, -2e-7, None], [3, 4, 5]], "words": ["[\n 1,\n 2\n]", "b"], "empty": []}
    text = record_text(record)
    assert json.loads(text) == record
    assert "[1.5, -2e-07, null]" in text
    assert "[3, 4, 5]" in text


def test_the_record_of_a_reading_names_the_record_and_whose_priors_they_are() -> None:
    record = reading_record(scans.reading())
    assert record["inputs"] == {"record": "scan.json", "digest": "sha256:" + "1" * 64, "file": "tern.toml"}
    assert {name: prior["is_stated"] for name, prior in record["priors"].items()} == {
        "strength": True,
        "mass": False,
    }
    (comparison,) = record["comparisons"]
    found = scans.reading().average
    assert comparison["ln_bayes_factor"] == found.ln_bayes_factor
    assert comparison["posterior_odds"] == pytest.approx(0.5 * np.exp(found.ln_bayes_factor))
    assert comparison["posterior_odds_error"] == pytest.approx(comparison["posterior_odds"] * found.error)


def test_what_is_not_established_has_no_odds_in_the_record() -> None:
    (comparison,) = reading_record(scans.reading(scans.unestablished()))["comparisons"]
    assert comparison["posterior_odds"] is None
    assert comparison["ln_posterior_odds"] is None
    assert not comparison["established"]
