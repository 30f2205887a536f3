"""What a hypothesis expects before a count is seen, against closed forms."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
from scipy import stats

from tests.analyses import background, counting, everything, region_of
from workbench.ensembles.predictive import prior_predictive
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Gamma
from workbench.hypotheses.shapes import Flat

Array = npt.NDArray[np.float64]
DRAWS = 4000


def straddles(law: stats.rv_discrete, count: float, level: float) -> bool:
    """Whether a count is the quantile of a discrete law, to 4 standard errors of the drawn share."""
    error = 4 * math.sqrt(level * (1 - level) / DRAWS)
    return bool(law.cdf(count - 1) <= level + error and law.cdf(count) >= level - error)


def test_a_known_background_has_poisson_bands() -> None:
    found = prior_predictive(counting(3.0, 50.0), "background only", draws=DRAWS)
    law = stats.poisson(50.0)
    for count, level in ((found.low[0], 0.16), (found.median[0], 0.5), (found.high[0], 0.84)):
        assert straddles(law, count, level)
    assert (found.total_low, found.total_median, found.total_high) == (
        found.low[0],
        found.median[0],
        found.high[0],
    )


def test_a_gamma_background_has_negative_binomial_bands() -> None:
    """Gamma of shape 9, rate 0.3: scipy's nbinom with n = 9, p = 0.3/1.3."""
    analysis = Analysis(
        "Gamma",
        (region_of([0.0, 1.0]),),
        (Parameter("rate", Gamma(9.0, 0.3)),),
        (background("b", Flat(), "rate"),),
    )
    found = prior_predictive(analysis, "background only", draws=DRAWS)
    law = stats.nbinom(9.0, 0.3 / 1.3)
    for count, level in ((found.low[0], 0.16), (found.median[0], 0.5), (found.high[0], 0.84)):
        assert straddles(law, count, level)
    # Negative control: a Poisson of the same mean is too narrow.
    assert not straddles(stats.poisson(30.0), found.low[0], 0.16)


def test_the_same_seed_gives_the_same_bands_and_observed_counts_do_not_matter() -> None:
    one = prior_predictive(counting(3.0, 50.0), "background only", seed=7)
    same = prior_predictive(counting(99.0, 50.0), "background only", seed=7)
    other = prior_predictive(counting(3.0, 50.0), "background only", seed=8)
    assert one.low.tolist() == same.low.tolist()
    assert (one.total_low, one.total_high) == (same.total_low, same.total_high)
    assert (one.low[0], one.median[0], one.high[0]) != (other.low[0], other.median[0], other.high[0])


def test_all_regions_have_their_bins_in_order() -> None:
    found = prior_predictive(everything(), "signal plus background", draws=200)
    assert found.low.shape == found.median.shape == found.high.shape == (11,)
    assert (found.low <= found.median).all()
    assert (found.median <= found.high).all()
    assert found.total_low < found.total_median < found.total_high
    assert found.hypothesis == "signal plus background"
