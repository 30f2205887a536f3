"""Backgrounds in doubt: what each alternative says, and the signal that it would fake if another one held."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.errors import Caution, InputError, Problem, quoted
from workbench.evidence.averaging import averaged
from workbench.evidence.odds import compare
from workbench.evidence.results import AlternativeEvidence, Evidence, Weighing
from workbench.evidence.spurious import FakedStrength, faked_strengths
from workbench.evidence.weigh import weigh, weigh_hypothesis
from workbench.hypotheses.alternatives import Variant, in_doubt, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.fit import fit
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.results import Ending
from workbench.likelihood.starts import searcher

Array = npt.NDArray[np.float64]

AVERAGE = "average"
NOTABLE_FAKE = 0.2  # of the strength's error: common practice, no source


@dataclass(frozen=True, slots=True)
class Fake:
    """What one alternative makes of the expected counts of another, without any signal.

    Attributes:
        truth: the alternative whose expected counts are taken for data.
        fitted: the alternative that they are fitted and weighed with; "average" for all of them.
        strengths: the fitted strengths; none for the average, which has no one fit.
        ln_bayes_factor, ln_bayes_factor_error: ln B of the signal that these counts would give [nats]; None
            where an evidence is missing.
        established: True when both evidences are.
    """

    truth: str
    fitted: str
    strengths: tuple[FakedStrength, ...]
    ln_bayes_factor: float | None
    ln_bayes_factor_error: float | None
    established: bool


@dataclass(frozen=True, slots=True, eq=False)
class Backgrounds:
    """Alternatives of the backgrounds, side by side.

    Attributes:
        hypothesis, against: the hypothesis with the signal, and the first.
        names: the alternatives.
        priors: their prior probabilities.
        weighing: the two hypotheses weighed; None without observed counts.
        expected: (alternative, bin) expected counts of the first hypothesis, without any signal [events].
        is_fitted: True where these are at its fit to the observed counts, False at its priors' medians.
        fakes: every alternative's expected counts as seen by every alternative and by their average.
        seed: the seed that every random number came from.
        cautions: what a reader should know.
    """

    hypothesis: str
    against: str
    names: tuple[str, ...]
    priors: tuple[float, ...]
    weighing: Weighing | None
    expected: Array
    is_fitted: bool
    fakes: tuple[Fake, ...]
    seed: int
    cautions: tuple[Caution, ...]

    @property
    def is_established(self) -> bool:
        """Tell whether every evidence that is shown is established."""
        is_weighed = self.weighing is None or self.weighing.established
        return is_weighed and all(fake.established for fake in self.fakes)

    def ln_faked(self, fake: Fake) -> tuple[float, float] | None:
        """Return by how much ln B of expected counts grows because another alternative is fitted.

            ln B(counts of the truth, weighed with another) - ln B(the same counts, weighed with the truth)

        Args:
            fake: what one alternative, or the average, makes of another one's counts.

        Returns:
            The change with its numerical error [nats]; None where an evidence is not established.

        Source:
            None, definition.
        """
        own = next(one for one in self.fakes if one.truth == one.fitted == fake.truth)
        if not (own.established and fake.established):
            return None
        if own.ln_bayes_factor is None or fake.ln_bayes_factor is None:
            return None
        if fake is own:
            return 0.0, 0.0
        errors = (fake.ln_bayes_factor_error or 0.0, own.ln_bayes_factor_error or 0.0)
        return fake.ln_bayes_factor - own.ln_bayes_factor, float(np.hypot(*errors))

    def largest_fake(self, fitted: str) -> tuple[str, FakedStrength] | None:
        """Return the truth and the strength that is largest in its errors when fitted with an alternative.

        Args:
            fitted: the alternative's name.

        Returns:
            Another alternative's name and the strength that its counts fake; None where nothing was fitted.
        """
        found = [
            (one.truth, strength)
            for one in self.fakes
            if one.fitted == fitted != one.truth
            for strength in one.strengths
            if strength.in_errors is not None
        ]
        return max(found, key=lambda pair: abs(pair[1].in_errors or 0.0), default=None)


def _quietly(_: str) -> None:
    """Say nothing."""


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def backgrounds(
    analysis: Analysis,
    hypothesis: str | None = None,
    *,
    seed: int = 1,
    say: Callable[[str], None] = _quietly,
) -> Backgrounds:
    """Return what each alternative of the backgrounds says, and the signal that it would fake.

    Each alternative in turn is taken for the truth: its expected counts without any signal, at its fit to the
    observed counts or at its priors' medians where nothing was observed, are fitted with the signal, and
    weighed, under every alternative. Expected counts need not be whole: n! is the gamma function of n + 1.

    Args:
        analysis: everything declared, with alternatives.
        hypothesis: a hypothesis with a signal; the first after the first hypothesis if left out.
        seed: where every random number comes from.
        say: told what is being worked on.

    Returns:
        Evidences, posterior probabilities and ln B of each alternative, and all fakes.

    Raises:
        InputError: if no background is in doubt, or there is no such hypothesis or nothing to compare.

    Source:
        None, definition; the spurious signal of a background function is common practice, no source.
    """
    pair = _pair(analysis, hypothesis)
    variants = variants_of(pair)
    say("weighing")
    is_observed = all(region.table.observed is not None for region in pair.regions)
    weighing = weigh(pair, seed=seed) if is_observed else None
    found = [_truth(variant.analysis, is_fitted=is_observed) for variant in variants]
    expected = np.array([counts for counts, _ in found])
    fakes: list[Fake] = []
    for place, variant in enumerate(variants):
        say(f"the signal that {variant.name} would fake")
        fakes += _fakes(pair, variants, variant.name, expected[place], (seed, place))
    against, other = (one.name for one in pair.hypotheses)
    made = Backgrounds(
        other,
        against,
        tuple(one.name for one in variants),
        tuple(one.prior for one in variants),
        weighing,
        expected,
        is_observed,
        tuple(fakes),
        seed,
        (),
    )
    unsure = [one.name for one, (_, is_sure) in zip(variants, found, strict=True) if not is_sure]
    own = weighing.cautions if weighing is not None else ()
    return replace(made, cautions=(*own, *_fit_cautions(unsure), *_fake_cautions(made)))


def _pair(analysis: Analysis, hypothesis: str | None) -> Analysis:
    """Return the analysis with the first hypothesis and the one that is asked for, or refuse it."""
    first, *others = analysis.hypotheses
    if not others or (hypothesis is not None and hypothesis == first.name):
        found = quoted(first.name) if others else "a single hypothesis"
        raise InputError(
            Problem(
                "Nothing to compare the first hypothesis with",
                "hypotheses",
                found,
                "a hypothesis with a signal, other than the first",
                "declare one" if not others else f"ask for {quoted(others[0].name)}",
            )
        )
    other = others[0] if hypothesis is None else analysis.hypothesis(hypothesis)
    pair = replace(analysis, hypotheses=(first, other))
    if not in_doubt(pair):
        raise InputError(
            Problem(
                "No background is in doubt",
                f"hypotheses {quoted(first.name)} and {quoted(other.name)}",
                "one description of each process",
                "a background process with alternatives",
                "describe it under [processes.NAME.alternatives.ALTERNATIVE], as the README shows",
            )
        )
    return pair


def _truth(analysis: Analysis, *, is_fitted: bool) -> tuple[Array, bool]:
    """Return (bin,) expected counts of the first hypothesis, and whether the fit behind them is sure."""
    name = analysis.hypotheses[0].name
    if is_fitted:
        found = fit(analysis, name, asymmetric=False)
        return found.expected, found.ending not in {Ending.NOT_CONVERGED, Ending.NO_SUPPORT}
    model = compile_model(analysis, name)
    return model.expected(model.natural_seeds(searcher(model).centre[None]))[0][0], True


def _fakes(
    pair: Analysis, variants: Sequence[Variant], truth: str, counts: Array, key: tuple[int, int]
) -> Iterator[Fake]:
    """Yield what every alternative, and their average, makes of one alternative's expected counts."""
    seeds = np.random.SeedSequence(key[0], spawn_key=(4, key[1])).spawn(2 * len(variants))
    parts: tuple[list[AlternativeEvidence], list[AlternativeEvidence]] = ([], [])
    for place, variant in enumerate(variants):
        found = []
        for index, hypothesis in enumerate(pair.hypotheses):
            model = replace(compile_model(variant.analysis, hypothesis.name), observed=counts)
            evidence = _evidence(model, seeds[2 * place + index])
            parts[index].append(AlternativeEvidence(variant.name, variant.prior, evidence))
            found.append((model, evidence))
        (_, without), (model, with_signal) = found
        yield _fake(truth, variant.name, with_signal, without, faked_strengths(model, counts))
    without, with_signal = (
        averaged(one.name, given) for one, given in zip(pair.hypotheses, parts, strict=True)
    )
    yield _fake(truth, AVERAGE, with_signal, without, ())


def _evidence(model: Model, seed: np.random.SeedSequence) -> Evidence:
    """Return the evidence of expected counts; closed forms count whole events, so they are left aside."""
    return weigh_hypothesis(model, seed, closed_forms=False).evidence


def _fake(
    truth: str, fitted: str, evidence: Evidence, against: Evidence, strengths: tuple[FakedStrength, ...]
) -> Fake:
    found = compare(evidence, against, 1.0)
    return Fake(
        truth, fitted, strengths, found.ln_bayes_factor, found.ln_bayes_factor_error, found.established
    )


def _fit_cautions(names: Sequence[str]) -> Iterator[Caution]:
    for name in names:
        yield Caution(
            "expected-not-fitted",
            f"The fit of background only with {quoted(name)} did not converge: what it would fake is that of "
            "the best point found.",
        )


def _fake_cautions(found: Backgrounds) -> Iterator[Caution]:
    """Yield a caution for each alternative that takes another one's background for a signal."""
    for name in found.names:
        largest = found.largest_fake(name)
        if largest is not None and abs(largest[1].in_errors or 0.0) > NOTABLE_FAKE:
            truth, strength = largest
            size = f"{strength.in_errors:.2f}".replace("-", "−")
            yield Caution(
                "spurious-signal",
                f"Fitted with {quoted(name)}, the expected counts of {quoted(truth)} alone fake a "
                f"{quoted(strength.parameter)} of {size} of its errors; common practice asks for less than "
                f"{NOTABLE_FAKE:g}.",
            )
