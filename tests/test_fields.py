"""Fields: formulas agree with NumPy, and no text of a configuration is ever executed."""

from __future__ import annotations

import math

import numpy as np
import pytest
import scipy.special
from hypothesis import given, settings
from hypothesis import strategies as st

from swmodel.choices import Choice
from swmodel.errors import RequestError
from swmodel.fields import (
    NAMES,
    FieldValue,
    Formula,
    SpeedField,
    evaluate,
    read_field,
    uses,
)
from swmodel.quantities import LENGTH

KEY = ("layer", "depth")
X = np.linspace(-3e5, 3e5, 7)[None, :]
Y = np.linspace(-1e5, 2e5, 4)[:, None]
CONSTANTS = {"f0": 1e-4, "beta": 2e-11, "g": 9.81, "H": 100.0, "Lx": 6e5, "Ly": 3e5, "c": 31.3, "a": 3.13e5}
FIELD = (
    'a field is a number in m, text with a unit such as "500 km", a formula in x and y, '
    'or { file = "...", variable = "..." }'
)
GRAMMAR = (
    "a formula is made of numbers, names, + - * / // % **, comparisons, and, or, not, and functions such as exp(x)"
)


def refused(value: object) -> str:
    with pytest.raises(RequestError) as raised:
        read_field(value, LENGTH)
    return str(raised.value)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("0.5 * sign(x)", 0.5 * np.sign(X)),
        ("exp(-(x**2 + y**2)/2e5**2)", np.exp(-(X**2 + Y**2) / 2e5**2)),
        ("H * (1 - 0.3*sech((y - 1e4)/a))", 100 * (1 - 0.3 / np.cosh((Y - 1e4) / 3.13e5))),
        ("where(-1e5 < x <= 1e5 and not y > 0, 1, 2)", np.where((X > -1e5) & (X <= 1e5) & (Y <= 0), 1.0, 2.0)),
        ("where(x == 0 or y != 0, x, y)", np.where((X == 0) | (Y != 0), X, Y)),
        ("(x > 0) - (y > 0)", (X > 0).astype(float) - (Y > 0).astype(float)),
        ("-x % Lx // 7e4 + +y", -X % 6e5 // 7e4 + Y),
        (
            "maximum(x, y) - minimum(hypot(x, y), arctan2(y, x))",
            np.maximum(X, Y) - np.minimum(np.hypot(X, Y), np.arctan2(Y, X)),
        ),
        ("cos(2*pi*x/Lx)\n  + sin(pi*y/Ly)", np.cos(2 * np.pi * X / 6e5) + np.sin(np.pi * Y / 3e5)),
        ("erf(x/1e5)", scipy.special.erf(X / 1e5)),
        ("f0 + beta*y", 1e-4 + 2e-11 * Y),
    ],
)
def test_a_formula_gives_what_numpy_gives(text: str, expected: np.ndarray) -> None:
    values = evaluate(text, X, Y, CONSTANTS, KEY)
    # the same operations in the same order; only sech is written differently here
    np.testing.assert_allclose(np.broadcast_to(values, (4, 7)), np.broadcast_to(expected, (4, 7)), rtol=1e-15, atol=0)


def test_a_formula_in_one_coordinate_is_evaluated_along_it_alone() -> None:
    assert np.shape(evaluate("x", X, Y, CONSTANTS, KEY)) == (1, 7)
    assert np.shape(evaluate("y", X, Y, CONSTANTS, KEY)) == (4, 1)
    assert evaluate("2 * H", X, Y, CONSTANTS, KEY) == 200.0


TWO = {
    "+": np.add,
    "-": np.subtract,
    "*": np.multiply,
    "/": np.divide,
    "//": np.floor_divide,
    "%": np.mod,
    "<": np.less,
    "<=": np.less_equal,
    ">": np.greater,
    ">=": np.greater_equal,
    "==": np.equal,
    "!=": np.not_equal,
    "and": np.logical_and,
    "or": np.logical_or,
}
ONE = {
    **{
        name: getattr(np, name)
        for name in ("sin", "cos", "tan", "sinh", "cosh", "tanh", "exp", "log", "sqrt", "abs", "sign")
    },
    "sech": lambda v: 1 / np.cosh(v),
    "erf": scipy.special.erf,
    "-": np.negative,
    "not": np.logical_not,
}
KNOWN = {**CONSTANTS, "pi": math.pi, "x": X, "y": Y}


def pairs() -> st.SearchStrategy[tuple[str, np.ndarray]]:
    """Random formulas, each with the values that NumPy gives for it."""
    leaves = st.sampled_from([*((name, KNOWN[name]) for name in NAMES), ("2", 2.0), ("0.5", 0.5), ("3e2", 300.0)])

    def grow(inner):
        def numbers(function, *values):
            with np.errstate(all="ignore"):
                return np.asarray(function(*(np.asarray(value, float) for value in values))).astype(float)

        return st.one_of(
            st.tuples(inner, st.sampled_from(sorted(TWO)), inner).map(
                lambda t: (f"({t[0][0]} {t[1]} {t[2][0]})", numbers(TWO[t[1]], t[0][1], t[2][1]))
            ),
            st.tuples(st.sampled_from(sorted(ONE)), inner).map(
                lambda t: (f"({t[0]}({t[1][0]}))", numbers(ONE[t[0]], t[1][1]))
            ),
            st.tuples(st.sampled_from(["minimum", "maximum", "hypot", "arctan2"]), inner, inner).map(
                lambda t: (f"{t[0]}({t[1][0]}, {t[2][0]})", numbers(getattr(np, t[0]), t[1][1], t[2][1]))
            ),
            st.tuples(inner, inner, inner).map(
                lambda t: (
                    f"where({t[0][0]}, {t[1][0]}, {t[2][0]})",
                    numbers(lambda a, b, c: np.where(a != 0, b, c), t[0][1], t[1][1], t[2][1]),
                )
            ),
            st.tuples(inner, st.sampled_from(["2", "-1", "0.5"])).map(
                lambda t: (f"({t[0][0]})**{t[1]}", numbers(np.power, t[0][1], float(t[1])))
            ),
        )

    return st.recursive(leaves, grow, max_leaves=10)


@settings(deadline=None)  # the machine may be busy
@given(pairs())
def test_every_formula_of_the_grammar_agrees_with_numpy(pair: tuple[str, np.ndarray]) -> None:
    text, expected = pair
    # the very same NumPy operations in the same order: the same bits, NaN and infinity included
    np.testing.assert_array_equal(Formula(text).values(KNOWN), expected)


@settings(deadline=None)  # the machine may be busy
@given(st.lists(st.sampled_from(["x", "y", "H", "2.5", "x**2", "-x", "-y**2"]), min_size=1, max_size=8), st.data())
def test_operators_bind_as_in_python(terms: list[str], data: st.DataObject) -> None:
    signs = [data.draw(st.sampled_from(["+", "-", "*", "/", "//", "%"])) for _ in terms[1:]]
    text = terms[0] + "".join(f" {sign} {term}" for sign, term in zip(signs, terms[1:], strict=True))
    with np.errstate(all="ignore"):
        expected = eval(text, {"__builtins__": {}}, KNOWN)  # the grammar of the test's own texts, on NumPy arrays
    # Python's numbers and NumPy's divide alike to the last bit
    np.testing.assert_array_equal(Formula(text).values(KNOWN), np.asarray(expected, float))


@settings(deadline=None)  # the machine may be busy
@given(st.one_of(st.text(max_size=80), st.text(alphabet="xyagH()+-*/.,^<>=! 0123456789eif[]{}:'\"_@\\\n", max_size=80)))
def test_the_parser_never_raises_anything_but_a_request_error(text: str) -> None:
    try:
        values = evaluate(read_field(text, LENGTH), X, Y, CONSTANTS, KEY)
    except RequestError:
        return
    assert np.isfinite(values).all()


@pytest.mark.parametrize(
    "text",
    [
        "__import__('os').system('true')",
        "().__class__.__mro__[1].__subclasses__()",
        "(lambda: 0)()",
        "[v for v in (1, 2)]",
        "x.__class__",
        "open('x')",
        "eval('1')",
        "f'{x}'",
        "(y := 2)",
        "x @ y",
        "x is y",
        "x in (1, 2)",
        "'a' * 9",
        "1j",
        "True",
        "...",
        "~x",
        "sin(x=1)",
        "sin(*(x, y))",
        "await x",
    ],
)
def test_python_beyond_arithmetic_is_refused(text: str) -> None:
    assert "formula" in refused(text)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "Hx * 2",
            'the formula uses "Hx", which is not a known name; '
            'known names: x, y, f0, beta, g, H, Lx, Ly, pi, c, a; did you mean "x"?',
        ),
        (
            "max(x, y)",
            'the formula uses "max", which is not a known function; known functions: sin, cos, tan, sinh, cosh, tanh, '
            "sech, exp, log, sqrt, abs, sign, hypot, arctan2, minimum, maximum, where, erf; "
            'did you mean "maximum"?',
        ),
        (
            "np.sin(x)",
            f'the formula holds an attribute, "np.sin(x)", which is not allowed; {GRAMMAR}; '
            "write sin without what stands before its point",
        ),
        ("x.real", f'the formula holds an attribute, "x.real", which is not allowed; {GRAMMAR}'),
        ("x^2", f'the formula holds "x^2", which is not allowed; {GRAMMAR}; write powers with **'),
        ("(x > 0) & (y > 0)", f'the formula holds "(x > 0) & (y > 0)", which is not allowed; {GRAMMAR}; write and, or'),
        (
            "1 if x > 0 else 2",
            f'the formula holds "1 if x > 0 else 2", which is not allowed; {GRAMMAR}; '
            "write where(condition, then, otherwise)",
        ),
        ("2(x + y)", f'the formula holds "2(x + y)", which is not allowed; {GRAMMAR}; write products with *'),
        ("x(y)", f"the formula calls x, which is no function; {GRAMMAR}; write products with *"),
        ("2 x", f'"2 x" has the unit x, which is not known; {FIELD}; write "2 * x"'),
        ("sin", "the formula uses the function sin without arguments; write sin(...)"),
        ("sin(x, y)", "sin is given 2 arguments; sin takes 1 argument"),
        ("where(x)", "where is given 1 argument; where takes 3 arguments"),
        (
            "x +",
            f'"x +" is not a formula; {GRAMMAR}; write products with *, powers with **, and close every bracket',
        ),
        ("1e999 * x", "the formula holds a number that is not finite"),
        ("x**1000", "the formula holds an exponent of 1000; exponents lie between -100 and 100"),
        ("9**9**9", "the formula holds an exponent of 3.8742e+08; exponents lie between -100 and 100"),
        ("x + " * 300 + "x", "a formula of 1201 characters; at most 1000 are allowed; put the values into a file"),
        ("-" * 60 + "x", "a formula nested over 50 deep; write it flatter"),
        (
            "1 000 km",
            f'"1 000 km" is not one number with a unit; {FIELD}; use a point for decimals and no thousands separator',
        ),
        ("45 deg", f'"45 deg" is an angle; {FIELD}'),
        (True, f"true is not a field; {FIELD}"),
        ([1], f"a list of 1 is not a field; {FIELD}"),
    ],
)
def test_a_field_that_is_none_is_refused_in_these_words(text: object, message: str) -> None:
    assert refused(text) == message


def test_a_text_with_a_unit_is_no_formula_and_a_formula_no_quantity() -> None:
    assert read_field("5 km", LENGTH) == 5000.0
    assert read_field(5, LENGTH) == 5.0
    assert read_field("5 * H", LENGTH) == Formula("5 * H")


def test_a_formula_tells_which_names_it_uses() -> None:
    assert uses("where(x > a, exp(-y/Ly), H)") == {"x", "y", "a", "Ly", "H"}
    assert uses(5.0) == set()


def test_a_value_that_is_not_finite_is_refused_with_its_place() -> None:
    with pytest.raises(RequestError) as raised:
        evaluate("1/x", X, Y, CONSTANTS, KEY)
    assert str(raised.value) == (
        'layer.depth: the formula "1/x" gives inf at x = 0 m, y = -100000 m, and at 3 more of 28 points; '
        "every value must be finite"
    )


def test_the_deformation_radius_is_refused_without_rotation() -> None:
    constants = {name: value for name, value in CONSTANTS.items() if name != "a"} | {"f0": 0.0}
    with pytest.raises(RequestError) as raised:
        evaluate("x/a", X, Y, constants, KEY)
    assert str(raised.value) == (
        "layer.depth: the formula uses a, which has no value here; a = c/|f0| is infinite where f0 = 0: write a length"
    )


class Layer(Choice):
    """A settings class as rooms write them."""

    depth: FieldValue = 1.0
    u: SpeedField = 0.0


@pytest.mark.parametrize(
    "depth", [100, "100 m", "100 + 0*x", {"file": "/data/bank.nc", "variable": "depth"}, {"file": "/a.npy"}]
)
def test_a_field_of_a_settings_class_survives_json(depth: object) -> None:
    layer = Layer(depth=depth)  # type: ignore[arg-type]
    assert Layer.model_validate_json(layer.model_dump_json()) == layer
