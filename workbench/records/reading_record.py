"""The record of `weigh --reprior`: a Bayes factor made of a saved updating ratio."""

from __future__ import annotations

import math
from typing import Any

from workbench.hypotheses.contents import prior_content
from workbench.records.files import FORMAT
from workbench.records.outcomes import ReadingOutcome
from workbench.records.provenance import versions
from workbench.records.sentences import reading_cautions
from workbench.records.weigh_record import caution_entries

_LARGEST = 700.0  # ln of what a number holds


def reading_record(outcome: ReadingOutcome) -> dict[str, Any]:
    """Return the record as JSON-ready values.

    Args:
        outcome: what was found.
    """
    found, average = outcome.found, outcome.average
    ln_odds = average.ln_posterior_odds
    odds = None if ln_odds is None or ln_odds > _LARGEST else math.exp(ln_odds)
    return {
        "format": FORMAT,
        "command": "reprior",
        "title": outcome.title,
        "inputs": {"record": outcome.record, "digest": outcome.record_digest, "file": outcome.file},
        "versions": versions(),
        "seed": found.seed,
        "established": average.established,
        "reason": found.reason or None,
        "priors": {
            name: {
                "prior": prior_content(prior),
                "text": prior.text(),
                "is_stated": name not in outcome.asked,
            }
            for name, prior in average.priors.items()
        },
        "averaged": {
            name: {"prior": prior_content(prior), "text": prior.text()}
            for name, prior in average.averaged.items()
        },
        "comparisons": [
            {
                "hypothesis": average.hypothesis,
                "against": average.against,
                "ln_bayes_factor": average.ln_bayes_factor,
                "ln_bayes_factor_error": average.error,
                "log10_bayes_factor": average.ln_bayes_factor / math.log(10.0),
                "prior_odds": average.prior_odds,
                "posterior_odds": odds,
                "posterior_odds_error": None if odds is None else odds * average.error,
                "ln_posterior_odds": ln_odds,
                "established": average.established,
            }
        ],
        "cautions": caution_entries(reading_cautions(found)),
    }
