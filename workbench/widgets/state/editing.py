"""The analysis in hand: edited step by step, undone and redone, never broken."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import traitlets

from workbench.errors import InputError, Problem
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.faults import KeyPath, dotted
from workbench.widgets.state.edits import Edit
from workbench.widgets.state.prior_edits import PriorOfParameter, numbers_of
from workbench.widgets.state.row_edits import RowGoneError

MOST_STEPS = 500


@dataclass(frozen=True, slots=True)
class Refusal:
    """What a control asked for and did not get.

    Attributes:
        control: the key that the control stands for.
        problems: what is wrong with it, in the terminal's words.
        edit: what was asked, so that it can be shown and mended; None if it was no edit.
    """

    control: KeyPath
    problems: tuple[Problem, ...]
    edit: Edit | None = None


@dataclass(frozen=True, slots=True)
class Step:
    """One edit that was made.

    Attributes:
        before, after: the analysis without it and with it.
        edit: the edit.
    """

    before: Analysis
    after: Analysis
    edit: Edit


class Editing(traitlets.HasTraits):
    """The analysis in hand and what can be done to it; changed by its methods only.

    A refused edit leaves the analysis as it is; its problems stand under the control that asked, until it
    asks for something else, the edit becomes possible, or another analysis comes into hand.

    Attributes:
        analysis: the analysis in hand; None before the first.
        refusals: what was asked for in vain, one a control.
        is_dirty: whether the analysis says something else than its file, or than what was brought in.
        undo_words, redo_words: what would be undone and done again; empty for nothing.
    """

    analysis = traitlets.Instance(Analysis, allow_none=True)
    refusals = traitlets.Tuple()
    is_dirty = traitlets.Bool(default_value=False)
    undo_words = traitlets.Unicode()
    redo_words = traitlets.Unicode()

    def __init__(self, analysis: Analysis | None = None) -> None:
        super().__init__()
        self._past: list[Step] = []
        self._future: list[Step] = []
        self._clean: Analysis | None = None
        if analysis is not None:
            self.hold(analysis)

    def hold(self, analysis: Analysis) -> None:
        """Take another analysis into hand, with nothing to undo."""
        self._past, self._future, self._clean = [], [], analysis
        self._show(analysis, ())

    def edit(self, edit: Edit, *, goes_on: bool = False) -> bool:
        """Make an edit, or note why not.

        Args:
            edit: what a control asks for.
            goes_on: the edit belongs to the same movement as the one before, of a slider for instance: both
                are undone together if they are of one control.

        Returns:
            True if the analysis now is as was asked.

        Raises:
            ValueError: if no analysis is in hand.
        """
        before = self._in_hand()
        others = tuple(one for one in self.refusals if one.control != edit.control)
        try:
            after = edit.made(before)
        except InputError as error:
            self.refusals = (*others, Refusal(edit.control, error.problems, edit))
            return False
        if after != before:
            last = self._past[-1] if self._past else None
            if goes_on and last is not None and last.edit.control == edit.control:
                self._past[-1] = Step(last.before, after, edit)
            else:
                self._past = [*self._past, Step(before, after, edit)][-MOST_STEPS:]
            self._future = []
        self._show(after, others)
        return True

    def set_number_of_prior(
        self, parameter: str, name: str, number: float | None, *, goes_on: bool = False
    ) -> bool:
        """Change one number of a prior, on top of what was asked for it in vain, if anything.

        Both ends of a range can so be moved one after the other, though it is empty in between.

        Args:
            parameter: the parameter's name.
            name: of the number.
            number: the number; None to leave it out.
            goes_on: as in `edit`.

        Returns:
            True if the analysis now is as was asked.
        """
        return self.edit(self.asked_prior(parameter).with_number(name, number), goes_on=goes_on)

    def asked_prior(self, parameter: str) -> PriorOfParameter:
        """Return the prior that a parameter's control shows: as asked in vain, else as it is.

        Raises:
            InputError: if there is no such parameter.
            ValueError: if no analysis is in hand.
        """
        prior = self._in_hand().parameter(parameter).prior
        shown = PriorOfParameter(parameter, prior.family, numbers_of(prior))
        for one in self.refusals:
            if one.control == shown.control and isinstance(one.edit, PriorOfParameter):
                return one.edit
        return shown

    def problems_at(self, control: KeyPath) -> tuple[Problem, ...]:
        """Return what a control shows: the problems that it caused.

        Args:
            control: its key; of a part of a control, such as one number of a prior, those of that part.
        """
        found: list[Problem] = []
        for one in self.refusals:
            if one.control == control:
                found += one.problems
            elif control[: len(one.control)] == one.control:
                found += (problem for problem in one.problems if problem.where == dotted(control))
        return tuple(found)

    def refuse(self, control: KeyPath, problems: Iterable[Problem]) -> None:
        """Note why a control that asks for no edit, such as a file's name, did not get what it wanted."""
        others = tuple(one for one in self.refusals if one.control != control)
        self.refusals = (*others, Refusal(control, tuple(problems)))

    def dismiss(self, control: KeyPath) -> None:
        """Forget what a control asked for in vain."""
        self.refusals = tuple(one for one in self.refusals if one.control != control)

    def undo(self) -> bool:
        """Take back the last edit.

        Returns:
            False if there was none.
        """
        if not self._past:
            return False
        step = self._past.pop()
        self._future.append(step)
        self._show(step.before, ())
        return True

    def redo(self) -> bool:
        """Make again what was taken back last.

        Returns:
            False if there was nothing.
        """
        if not self._future:
            return False
        step = self._future.pop()
        self._past.append(step)
        self._show(step.after, ())
        return True

    def settle(self, analysis: Analysis) -> None:
        """Note that a file now says what an analysis says."""
        self._clean = analysis
        if self.analysis is not None:
            self._show(self.analysis, self.refusals)

    def _in_hand(self) -> Analysis:
        if self.analysis is None:
            raise ValueError("no analysis is in hand")
        return self.analysis

    def _show(self, analysis: Analysis, refusals: tuple[Refusal, ...]) -> None:
        with self.hold_trait_notifications():  # whoever looks at one of them finds the others right
            self.analysis = analysis
            self.refusals = tuple(_judged_again(refusals, analysis))
            self.is_dirty = analysis != self._clean
            self.undo_words = self._past[-1].edit.words if self._past else ""
            self.redo_words = self._future[-1].edit.words if self._future else ""


def _judged_again(refusals: Iterable[Refusal], analysis: Analysis) -> Iterable[Refusal]:
    """Yield the refusals that hold for an analysis, with the problems as they are now."""
    for one in refusals:
        if one.edit is None:
            yield one
            continue
        try:
            one.edit.made(analysis)
        except RowGoneError:  # and its control with it
            continue
        except InputError as error:
            yield Refusal(one.control, error.problems, one.edit)
