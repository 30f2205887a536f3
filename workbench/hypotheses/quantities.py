"""What may stand for a number in a yield or a shape.

A number, the name of a parameter, a curve over a parameter, or a tuple of these (multiplied).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache

from workbench.hypotheses.jets import Jet
from workbench.hypotheses.splines import Spline


@dataclass(frozen=True, slots=True)
class Curve:
    """A number that depends on a parameter, interpolated by the monotone cubic (PCHIP).

    Attributes:
        parameter: the parameter's name.
        at: parameter values, ascending.
        values: the number at each of them.
    """

    parameter: str
    at: tuple[float, ...]
    values: tuple[float, ...]


Quantity = float | str | Curve | tuple["float | str | Curve", ...]


def parameters_of(quantity: Quantity) -> tuple[str, ...]:
    """Return the names of the parameters a quantity depends on, each once, in order of appearance.

    Args:
        quantity: a number, a name, a curve or a product.

    Returns:
        The names.

    Source:
        None, definition.
    """
    names: dict[str, None] = {}
    for factor in quantity if isinstance(quantity, tuple) else (quantity,):
        if isinstance(factor, str):
            names[factor] = None
        elif isinstance(factor, Curve):
            names[factor.parameter] = None
    return tuple(names)


def evaluate(quantity: Quantity, parameters: Mapping[str, Jet]) -> Jet:
    """Return a quantity at parameter values.

    Args:
        quantity: a number, a name, a curve or a product (an empty one is 1).
        parameters: name to jet (...), all of as many variables.

    Returns:
        (...) the quantity as a jet in the same variables; (), if it depends on no parameter.

    Source:
        None, definition.
    """
    variables = max((jet.variables for jet in parameters.values()), default=0)
    product = Jet.constant(1.0, variables)
    for factor in quantity if isinstance(quantity, tuple) else (quantity,):
        if isinstance(factor, str):
            product = product * parameters[factor]
        elif isinstance(factor, Curve):
            product = product * _spline(factor).along(parameters[factor.parameter])
        else:
            product = product * float(factor)
    return product


@lru_cache(maxsize=256)
def _spline(curve: Curve) -> Spline:
    return Spline(curve.at, curve.values)
