"""Ties a control to a trait of the state: the state decides, the control asks.

Plain links of traitlets go wrong with bounded controls: a state beyond the range is shown at its end and then
changed to it, a refused value stays on screen, and a narrower range changes the state.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Protocol

import traitlets

from workbench.errors import InputError
from workbench.widgets.home import Home


class Control(Protocol):
    """What asks for values of a trait and shows the one that was decided: a `Number`, a `Plain`."""

    def show(self, value: Any) -> None:
        """Show the value that was decided."""

    def complain(self, text: str) -> None:
        """Show why a request was refused; nothing if it was not."""

    def on_asked(
        self,
        callback: Callable[[Any], object],
        at_home: Callable[[Callable[..., object]], Callable[..., None]],
    ) -> None:
        """Call back when a value is asked for, through what makes callbacks run at home."""


def bind(home: Home, state: traitlets.HasTraits, name: str, control: Control) -> None:
    """Tie a control to a trait: it shows what the state holds, and asks the state for what the user wants.

    A value that the state refuses (an `InputError` or `TraitError` of its validators) is undone on the
    control, with the reason below it.

    Args:
        home: where both are changed.
        state: whose trait it is.
        name: of the trait.
        control: what shows it and asks.
    """

    def ask(value: Any) -> None:
        try:
            setattr(state, name, value)
        except (InputError, traitlets.TraitError) as error:
            control.complain(str(error))
        else:
            control.complain("")
        control.show(getattr(state, name))  # undone if it was refused, or as the state rounded it

    def follow(change: dict[str, Any]) -> None:
        control.complain("")
        control.show(change["new"])

    control.on_asked(ask, home.wrap)
    state.observe(home.wrap(follow), name)
    control.show(getattr(state, name))
