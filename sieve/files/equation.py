"""The table [curve] of a case file: which model an equation is of, and in which variables.

A homogeneous equation in three variables is a plane curve; everything else is read as y^2 + h(x)*y = f(x).
The variables of a plane curve are any three names: in the order of the key `variables`, else x, y, z when
these are the names used, else in the order in which they occur.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sieve.curves.notation import Origin, Polynomial, names_in, parse_equation
from sieve.errors import InputError, NotSupported
from sieve.files.reading import Table, describe

WANTED = "an equation y^2 + h(x)*y = f(x), or a homogeneous one in three variables (a plane curve)"
_USUAL = ("x", "y", "z")


@dataclass(frozen=True)
class WrittenEquation:
    """An equation as written.

    Fields: `polynomial`, left side minus right side, exponents in the order of the three `variables`;
    `plane`, whether it is a homogeneous equation of a plane curve (else only x and y occur).
    """

    polynomial: Polynomial
    text: str
    variables: tuple[str, str, str]
    plane: bool
    origin: Origin

    @property
    def degree(self) -> int:
        """The total degree."""
        return max(sum(exponents) for exponents in self.polynomial)


def read_equation(table: Table) -> WrittenEquation:
    """The equation of a case file.

    Raises `InputError` for an equation that cannot be read or is neither in x and y alone nor homogeneous in
    three variables, `NotSupported` for canonical models.
    """
    curve = table.table("curve", "a table [curve]", ["equation", "equations", "variables"])
    if curve.has("equations"):
        if curve.has("equation"):
            raise curve.origin.error("equation and equations", "one of the two")
        _refuse_canonical(curve)
    fixed = _fixed_variables(curve) if curve.has("variables") else None
    text, origin = curve.notation("equation", WANTED)
    used = names_in(text, origin)
    variables = fixed
    if variables is None and len(used) == 3 and _own_names(text, used, origin):
        variables = (used[0], used[1], used[2])
    equation = parse_equation(text, variables or _USUAL, origin)
    plane = fixed is not None or any(exponents[2] for exponents in equation)
    if plane and not _homogeneous(equation):
        found = f"an equation in {', '.join(variables or _USUAL)} that is not homogeneous"
        raise origin.error(found, WANTED)
    return WrittenEquation(equation, text, variables or _USUAL, plane, origin)


def _own_names(text: str, used: Sequence[str], origin: Origin) -> bool:
    """Whether three names are the variables of a plane curve, and not x, y and an unknown one."""
    if set(used) <= set(_USUAL):
        return False
    if not {"x", "y"} <= set(used):
        return True
    try:
        return _homogeneous(parse_equation(text, used, origin))
    except InputError:
        return False


def _homogeneous(equation: Polynomial) -> bool:
    return len({sum(exponents) for exponents in equation}) == 1


def _fixed_variables(curve: Table) -> tuple[str, str, str]:
    names = _names(curve)
    if len(names) != 3:
        raise curve.at("variables").error(describe(names), "three different names, or equations")
    return names[0], names[1], names[2]


def _names(curve: Table) -> list[str]:
    variables = curve.array("variables", "a list of names")
    for i, name in enumerate(variables, 1):
        if not isinstance(name, str) or len(name) > 20 or not (name.isascii() and name.isidentifier()):
            raise curve.at(f"variables no. {i}").error(describe(name), "a name")
    if len(set(variables)) < max(len(variables), 3):
        raise curve.at("variables").error(describe(variables), "at least three different names")
    return variables


def _refuse_canonical(curve: Table) -> None:
    variables = _names(curve)
    equations = curve.array("equations", "a list of equations")
    for i, text in enumerate(equations, 1):
        place = curve.at(f"equations no. {i}")
        if not isinstance(text, str):
            raise place.error(describe(text), "an equation, as a text")
        parse_equation(text, variables, place)
    expected = "y^2 + h(x)*y = f(x) or a plane curve in this version"
    raise NotSupported(curve.origin.file, curve.origin.place, "a canonical model", expected)
