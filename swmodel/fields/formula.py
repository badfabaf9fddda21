"""Formulas: Python's arithmetic in x, y and the experiment's own constants, without ever executing Python.

The text is parsed into a syntax tree, every node of which must be on a short list; the tree is then walked with NumPy.
Length, depth and exponents are bounded. Everything is a float: a comparison gives 1 or 0.
"""

from __future__ import annotations

import ast
import math
import warnings
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..choices import did_you_mean
from ..errors import Fault, RequestError
from ..quantities import shown

LONGEST = 1000  # characters
DEEPEST = 50  # nested operations
LARGEST_EXPONENT = 100.0

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Formula:
    """An arithmetic expression, checked when it is made.

    Parameters
    ----------
    text : str
        The expression, in Python's arithmetic and SI.

    Raises
    ------
    RequestError
        Where the text is no formula, or uses what is not on the lists `NAMES`, `FUNCTIONS` and `OPERATORS`.
    """

    text: str
    tree: ast.expr = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        tree = _parsed(self.text)
        _check(tree, self.text, 0)
        object.__setattr__(self, "tree", tree)

    def __str__(self) -> str:
        return self.text

    @cached_property
    def names(self) -> frozenset[str]:
        """The names it uses: coordinates and constants."""
        called = {id(node.func) for node in ast.walk(self.tree) if isinstance(node, ast.Call)}
        named = (node for node in ast.walk(self.tree) if isinstance(node, ast.Name) and id(node) not in called)
        return frozenset(node.id for node in named)

    def values(self, known: Mapping[str, float | Array]) -> Array:
        """Evaluate with values for every name it uses; what is not finite is left to the caller.

        Parameters
        ----------
        known : mapping of str to float or ndarray
            x, y and the constants.
        """
        with np.errstate(all="ignore"):
            return np.asarray(_value(self.tree, known), np.float64)


def is_python(text: str) -> bool:
    """Whether a text is an expression in Python's grammar, allowed or not."""
    try:
        _parsed(text)
    except RequestError:
        return False
    return True


def _parsed(text: str) -> ast.expr:
    """Return the syntax tree of an expression."""
    if len(text) > LONGEST:
        found = f"a formula of {len(text)} characters"
        raise RequestError(Fault((), found, f"at most {LONGEST} are allowed", "put the values into a file"))
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # the parser warns of oddities such as "1if x"
            return ast.parse(" ".join(text.split("\n")).strip(), mode="eval").body
    except (SyntaxError, ValueError, MemoryError, RecursionError):
        remedy = "write products with *, powers with **, and close every bracket"
        raise RequestError(Fault((), f"{shown(text)} is not a formula", GRAMMAR, remedy)) from None


def _check(node: ast.AST, text: str, depth: int) -> None:
    """Refuse every node that is not on the lists."""
    if depth > DEEPEST:
        raise RequestError(Fault((), f"a formula nested over {DEEPEST} deep", remedy="write it flatter"))
    match node:
        case ast.Constant(value=int() | float() as value) if not isinstance(value, bool):
            _check_number(value)
            return
        case ast.Name(id=name) if name in NAMES:
            return
        case ast.Name(id=name):
            _refuse_name(name, called=False)
        case ast.Call(func=ast.Name(id=name), args=arguments, keywords=[]) if name in FUNCTIONS:
            wanted = FUNCTIONS[name][1]
            if len(arguments) != wanted:
                found = f"{name} is given {_counted(len(arguments))}"
                raise RequestError(Fault((), found, f"{name} takes {_counted(wanted)}"))
            parts: list[ast.expr] = arguments
        case ast.Call(func=ast.Name(id=name), keywords=[]):
            _refuse_name(name, called=True)
        case ast.BinOp(left=left, op=operation, right=right) if type(operation) in OPERATORS:
            parts = [left, right]
        case ast.UnaryOp(op=ast.UAdd() | ast.USub() | ast.Not(), operand=operand):
            parts = [operand]
        case ast.BoolOp(values=conditions):
            parts = conditions
        case ast.Compare(left=left, ops=operations, comparators=others) if all(
            type(o) in COMPARISONS for o in operations
        ):
            parts = [left, *others]
        case _:
            _refuse(node, text)
    for part in parts:
        _check(part, text, depth + 1)
    if isinstance(node, ast.BinOp) and isinstance(node.op, ast.Pow):
        _check_exponent(node.right)


def _check_number(value: float) -> None:
    try:
        finite = math.isfinite(float(value))
    except OverflowError:
        finite = False
    if not finite:
        raise RequestError(Fault((), "the formula holds a number that is not finite"))


def _check_exponent(node: ast.expr) -> None:
    """An exponent without names is known beforehand, and must be moderate."""
    if any(isinstance(part, ast.Name) and part.id in NAMES for part in ast.walk(node)):
        return
    with np.errstate(all="ignore"):
        exponent = float(_value(node, {}))
    if not abs(exponent) <= LARGEST_EXPONENT:
        found = f"the formula holds an exponent of {exponent:g}"
        raise RequestError(Fault((), found, f"exponents lie between {-LARGEST_EXPONENT:g} and {LARGEST_EXPONENT:g}"))


def _refuse_name(name: str, called: bool) -> None:
    if called and name in NAMES:
        raise RequestError(
            Fault((), f"the formula calls {name}, which is no function", GRAMMAR, "write products with *")
        )
    if not called and name in FUNCTIONS:
        arguments = ", ".join(["..."] * FUNCTIONS[name][1])
        remedy = f"write {name}({arguments})"
        raise RequestError(Fault((), f"the formula uses the function {name} without arguments", remedy=remedy))
    what = "function" if called else "name"
    allowed = FUNCTIONS if called else NAMES
    found = f"the formula uses {shown(name)}, which is not a known {what}"
    listed = f"known {what}s: {', '.join(allowed)}"
    raise RequestError(Fault((), found, listed, did_you_mean(name, allowed)))


def _refuse(node: ast.AST, text: str) -> None:
    part = shown(ast.get_source_segment(" ".join(text.split("\n")).strip(), node) or text)
    found = f"the formula holds {part}, which is not allowed"
    remedy = ""
    attribute = node.func if isinstance(node, ast.Call) else node
    if isinstance(attribute, ast.Attribute):
        found = f"the formula holds an attribute, {part}, which is not allowed"
        known = attribute.attr in FUNCTIONS or attribute.attr in NAMES
        remedy = f"write {attribute.attr} without what stands before its point" if known else ""
    elif isinstance(node, ast.BinOp) and isinstance(node.op, ast.BitXor):
        remedy = "write powers with **"
    elif isinstance(node, ast.BinOp) and isinstance(node.op, ast.BitAnd | ast.BitOr):
        remedy = "write and, or"
    elif isinstance(node, ast.Call) and not node.keywords:
        remedy = "write products with *"
    elif isinstance(node, ast.IfExp):
        remedy = "write where(condition, then, otherwise)"
    raise RequestError(Fault((), found, GRAMMAR, remedy))


def _counted(number: int) -> str:
    return f"{number} argument" + ("" if number == 1 else "s")


def _value(node: ast.AST, known: Mapping[str, float | Array]) -> Any:
    """Value of a checked node."""
    match node:
        case ast.Constant(value=value):
            return np.float64(value)  # type: ignore[arg-type]
        case ast.Name(id=name):
            return np.asarray(known[name], np.float64)
        case ast.Call(func=ast.Name(id=name), args=arguments):
            return FUNCTIONS[name][0](*(_value(argument, known) for argument in arguments))
        case ast.BinOp(left=left, op=operation, right=right):
            return OPERATORS[type(operation)](_value(left, known), _value(right, known))
        case ast.UnaryOp(op=ast.Not(), operand=operand):
            return np.equal(_value(operand, known), 0).astype(np.float64)
        case ast.UnaryOp(op=ast.USub(), operand=operand):
            return np.negative(_value(operand, known))
        case ast.UnaryOp(operand=operand):
            return _value(operand, known)
        case ast.BoolOp(op=operation, values=conditions):
            join = np.logical_and if isinstance(operation, ast.And) else np.logical_or
            result = _value(conditions[0], known) != 0
            for condition in conditions[1:]:
                result = join(result, _value(condition, known) != 0)
            return np.asarray(result, np.float64)
        case ast.Compare(left=left, ops=operations, comparators=others):
            parts = [_value(part, known) for part in (left, *others)]
            result = np.True_
            for one, comparison, other in zip(parts, operations, parts[1:], strict=False):
                result = np.logical_and(result, COMPARISONS[type(comparison)](one, other))
            return np.asarray(result, np.float64)
    raise AssertionError(f"a node slipped through the check: {node!r}")


def _sech(x: Array) -> Any:
    return 1 / np.cosh(x)


def _erf(x: Array) -> Any:
    from scipy.special import erf

    return erf(x)


def _where(condition: Array, then: Array, otherwise: Array) -> Any:
    return np.where(np.not_equal(condition, 0), then, otherwise)


# Names, with what they mean.
NAMES: dict[str, str] = {
    "x": "distance along x, m",
    "y": "distance along y, m",
    "f0": "Coriolis parameter at the reference latitude, rad/s",
    "beta": "its change with y, 1/(m s)",
    "g": "gravity, reduced where given, m/s^2",
    "H": "reference depth, m",
    "Lx": "extent of the domain along x, m",
    "Ly": "extent of the domain along y, m",
    "pi": "3.14159...",
    "c": "gravity-wave speed sqrt(g H), m/s",
    "a": "deformation radius c/|f0|, on the equatorial plane sqrt(c/beta), m",
}

# Functions, with their number of arguments.
FUNCTIONS: dict[str, tuple[Callable[..., Any], int]] = {
    "sin": (np.sin, 1),
    "cos": (np.cos, 1),
    "tan": (np.tan, 1),
    "sinh": (np.sinh, 1),
    "cosh": (np.cosh, 1),
    "tanh": (np.tanh, 1),
    "sech": (_sech, 1),
    "exp": (np.exp, 1),
    "log": (np.log, 1),
    "sqrt": (np.sqrt, 1),
    "abs": (np.abs, 1),
    "sign": (np.sign, 1),
    "hypot": (np.hypot, 2),
    "arctan2": (np.arctan2, 2),
    "minimum": (np.minimum, 2),
    "maximum": (np.maximum, 2),
    "where": (_where, 3),
    "erf": (_erf, 1),
}

OPERATORS: dict[type[ast.operator], Callable[..., Any]] = {
    ast.Add: np.add,
    ast.Sub: np.subtract,
    ast.Mult: np.multiply,
    ast.Div: np.divide,
    ast.FloorDiv: np.floor_divide,
    ast.Mod: np.mod,
    ast.Pow: np.power,
}

COMPARISONS: dict[type[ast.cmpop], Callable[..., Any]] = {
    ast.Lt: np.less,
    ast.LtE: np.less_equal,
    ast.Gt: np.greater,
    ast.GtE: np.greater_equal,
    ast.Eq: np.equal,
    ast.NotEq: np.not_equal,
}

GRAMMAR = (
    "a formula is made of numbers, names, + - * / // % **, comparisons, and, or, not, and functions such as exp(x)"
)
