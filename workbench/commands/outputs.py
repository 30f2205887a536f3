"""What a command will write, looked at before anything is computed."""

from __future__ import annotations

import argparse

from workbench.commands.delivery import refuse_unwritable


def refuse_undeliverable(options: argparse.Namespace) -> None:
    """Refuse files for the result and its picture that can't be written, before anything is computed.

    Args:
        options: what was asked for; `picture` is the picture's file, or None.

    Raises:
        InputError: if a file can't be written, or the kind of picture is not known.
    """
    refuse_unwritable("--output", options.output)
    if options.picture is not None:
        from workbench.commands.pictures import refuse_other_kinds

        refuse_other_kinds("--picture", options.picture)
