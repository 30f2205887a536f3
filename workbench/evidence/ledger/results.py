"""What the ledger answers: the weights of bins, regions and uncertainties in one Bayes factor."""

from __future__ import annotations

from dataclasses import dataclass

from workbench.errors import Caution
from workbench.evidence.results import Comparison, Weighing

REWEIGHTED, AFRESH, EXACT = "reweighted", "fresh evidence", "closed form"


@dataclass(frozen=True, slots=True)
class Part:
    """What one bin, or one region, contributes to a Bayes factor.

    Attributes:
        region: the region's name.
        place: the bin's place in its region, counted from 1; None for a whole region.
        low, high: its range on the region's axis.
        observed: counted events [events].
        share: its weight of evidence; those of all bins add up to ln B [nats]. None where not established.
        order_error: one standard error of the share from the finite number of orders [nats].
        sampling_error: one standard error of the share from the finite number of draws [nats].
        without: ln B of all other bins [nats]; None where it is not established.
        without_error: one standard error of it [nats].
        loss: what ln B loses without it [nats].
        loss_error: one standard error of it [nats].
        way: how `without` was found: "reweighted", "fresh evidence" or "closed form".
        k_hat: the larger Pareto shape of the two hypotheses' weights; None where nothing was reweighted.
    """

    region: str
    place: int | None
    low: float
    high: float
    observed: int
    share: float | None
    order_error: float | None
    sampling_error: float | None
    without: float | None
    without_error: float | None
    loss: float | None
    loss_error: float | None
    way: str
    k_hat: float | None

    @property
    def share_error(self) -> float | None:
        """Return one standard error of the share: orders and draws in quadrature [nats]."""
        if self.order_error is None or self.sampling_error is None:
            return None
        return float((self.order_error**2 + self.sampling_error**2) ** 0.5)


@dataclass(frozen=True, slots=True)
class Hold:
    """What a Bayes factor would be with one uncertainty frozen, or twice as large.

    Attributes:
        name: the source or nuisance parameter; "smooth distortion" for all terms of a distortion together.
        kind: "source", "nuisance parameter" or "distortion".
        frozen, frozen_error: ln B with it held at the middle of its prior [nats]; None if not established.
        doubled, doubled_error: ln B with it twice as large [nats]: every factor of a source squared, the
            prior of a nuisance parameter twice as wide; None if not established, or where it has no width.
    """

    name: str
    kind: str
    frozen: float | None
    frozen_error: float | None
    doubled: float | None
    doubled_error: float | None

    def reach(self, ln_bayes_factor: float) -> float:
        """Return the larger change of ln B that the two make [nats]; 0 where neither is known."""
        known = [value for value in (self.frozen, self.doubled) if value is not None]
        return max((abs(value - ln_bayes_factor) for value in known), default=0.0)


@dataclass(frozen=True, slots=True)
class Sum:
    """A sum of shares with its one standard error [nats]."""

    value: float
    error: float


@dataclass(frozen=True, slots=True)
class Shares:
    """How the shares were made.

    Attributes:
        orders: number of passes over the bins, the reversed ones included.
        total: what the shares add up to: ln B [nats]; None where not established.
        total_error: one standard error of it [nats].
        draws: number of draws, of the hypothesis that took more.
        effective: the smallest effective number of draws at any step of a typical pass (half have more); None
            where nothing was drawn, as in the next two.
        least_effective: the smallest at any step of any pass.
        k_hat: Pareto shape of the weights where a typical pass has its fewest effective draws.
        established: True when draws, errors and the agreement with ln B are all in order.
        reason: why it is not; empty when it is.
        rest: what all bins but the k heaviest add up to, k = 0, 1, 2, ..., at most 32; empty where not
            established. Their shares' errors are not independent, so that these can't be had from those.
        drawn: ln B as the draws of the shares give it themselves; None where none were needed.
    """

    orders: int
    total: float | None
    total_error: float | None
    draws: int
    effective: float | None
    least_effective: float | None
    k_hat: float | None
    established: bool
    reason: str
    rest: tuple[Sum, ...] = ()
    drawn: Sum | None = None


@dataclass(frozen=True, slots=True)
class Account:
    """The ledger of one hypothesis against the first.

    Attributes:
        comparison: the Bayes factor that is accounted for.
        shares: how the shares were made; None where none were asked for.
        bins: every bin, in order; empty where not asked for.
        regions: every region, in order; empty where not asked for.
        uncertainties: every source and nuisance parameter that either hypothesis uses; empty where not asked
            for.
    """

    comparison: Comparison
    shares: Shares | None
    bins: tuple[Part, ...]
    regions: tuple[Part, ...]
    uncertainties: tuple[Hold, ...]

    @property
    def established(self) -> bool:
        """Return True when the Bayes factor, the shares and every part's loss are."""
        parts = (*self.bins, *self.regions)
        has_shares = self.shares is None or self.shares.established
        return self.comparison.established and has_shares and all(part.loss is not None for part in parts)


@dataclass(frozen=True, slots=True)
class Ledger:
    """What carries the evidence, one account for each hypothesis but the first.

    Attributes:
        weighing: the evidences that are accounted for.
        accounts: one a comparison, in file order.
        seed: where every random number came from.
        cautions: what a reader should know.
    """

    weighing: Weighing
    accounts: tuple[Account, ...]
    seed: int
    cautions: tuple[Caution, ...] = ()

    @property
    def established(self) -> bool:
        """Return True when every account is."""
        return all(account.established for account in self.accounts)
