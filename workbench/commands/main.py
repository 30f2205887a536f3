"""The command `oddsbench`: finds the subcommand, and turns every way of ending into text and an exit code."""

from __future__ import annotations

import importlib
import os
import sys
from collections.abc import Sequence

from workbench.commands.parsing import Parser
from workbench.commands.terminal import print_text
from workbench.errors import InputError, Problem, nearest, quoted

DONE = 0
NOT_ESTABLISHED = 1
WRONG_INPUT = 2
OUR_FAULT = 3
STOPPED = 130

# name: (module, what it does); modules are imported only when asked for, so that the command starts quickly
COMMANDS = {
    "weigh": ("workbench.commands.weigh", "evidences, Bayes factors and posterior odds"),
    "check": (
        "workbench.commands.check",
        "what an input says, what its priors predict, whether anything fits",
    ),
    "ledger": ("workbench.commands.ledger", "what carries the evidence: by bin, region and uncertainty"),
    "fit": ("workbench.commands.fit", "maximum likelihood of each hypothesis, with errors and pulls"),
    "scan": ("workbench.commands.scan", "updating ratio along signal parameters, free of their priors"),
    "backgrounds": (
        "workbench.commands.backgrounds",
        "alternatives of the backgrounds: their evidences, and the signal that each would fake",
    ),
    "breakpoint": (
        "workbench.commands.breakpoint",
        "how wrong the background must be, smoothly, to take the evidence away",
    ),
    "priors": ("workbench.commands.priors", "what the choice of priors does to the Bayes factor"),
}

ABOUT = """\
usage: oddsbench COMMAND FILE [options]

Posterior odds for signal against background in binned event counts.

{commands}

oddsbench COMMAND --help lists the options of one command.
Exit codes: 0 done; 1 done, but the answer is not established; 2 wrong input or usage; 3 a fault of ours;
130 stopped by the user.
"""


def main(words: Sequence[str] | None = None) -> int:
    """Run one subcommand and return the exit code.

    Args:
        words: the command line after the program's name; None takes this process' own.

    Returns:
        0 done; 1 done, but the answer is not established; 2 wrong input or usage; 3 a fault of ours;
        130 stopped by the user.
    """
    asked = list(sys.argv[1:] if words is None else words)
    try:
        return _flushed(_dispatch(asked))
    except InputError as error:
        return _complain("\n\n".join(problem.text() for problem in error.problems), WRONG_INPUT)
    except KeyboardInterrupt:
        return _complain("\nStopped.", STOPPED)
    except BrokenPipeError:
        _let_go_of_output()
        return DONE
    except SystemExit as ending:  # how argparse leaves after --help
        return ending.code if isinstance(ending.code, int) else DONE
    except Exception as error:  # noqa: BLE001 -- the one place that catches what nobody foresaw, and says so
        from workbench.commands.faults import fault_problem

        return _complain(fault_problem(error, asked).text(), OUR_FAULT)


def _dispatch(asked: list[str]) -> int:
    if not asked:
        raise InputError(
            Problem(
                "No command was given",
                "oddsbench",
                "nothing after the program's name",
                "one of: " + ", ".join(COMMANDS),
                "oddsbench weigh FILE, or oddsbench --help",
            )
        )
    first, rest = asked[0], asked[1:]
    if first in {"-h", "--help", "--version"}:
        return _about(first)
    if first not in COMMANDS:
        raise InputError(
            Problem(
                "Unknown command",
                "oddsbench",
                quoted(first),
                "one of: " + ", ".join(COMMANDS),
                nearest(first, COMMANDS),
            )
        )
    home, summary = COMMANDS[first]
    module = importlib.import_module(home)
    parser = Parser(prog=f"oddsbench {first}", description=summary[0].upper() + summary[1:] + ".")
    module.add_options(parser)
    code: int = module.run(parser.understand(rest))
    return code


def _about(flag: str) -> int:
    if flag == "--version":
        from workbench import __version__

        print_text(f"oddsbench {__version__}\n", sys.stdout)
        return DONE
    widest = max(map(len, COMMANDS))
    commands = "\n".join(f"  {name:<{widest}}  {summary}" for name, (_, summary) in COMMANDS.items())
    print_text(ABOUT.format(commands=commands), sys.stdout)
    return DONE


def _flushed(code: int) -> int:
    sys.stdout.flush()
    return code


def _complain(text: str, code: int) -> int:
    try:
        print_text(text + "\n", sys.stderr)
        sys.stderr.flush()
    except BrokenPipeError:
        _let_go_of_output()
    return code


def _let_go_of_output() -> None:
    """Point the output at nothing, so that Python's own flush at exit does not complain as well."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    for stream in (sys.stdout, sys.stderr):
        try:
            os.dup2(nowhere, stream.fileno())
        except (OSError, ValueError):  # a stream that was replaced by one without a descriptor, or is closed
            continue
    os.close(nowhere)
