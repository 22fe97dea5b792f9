"""Formulas: read as ordinary mathematics, bounded, and harmless; Python's and sympy's arithmetic as references."""

import math
from collections.abc import Callable
from typing import Any

import mpmath
import numpy as np
import pytest
import sympy
from hypothesis import example, given
from hypothesis import strategies as st

from worksheet.model.arithmetic import FLOAT_FUNCTIONS, FUNCTIONS
from worksheet.model.formula import Formula, FormulaError, evaluate, parse, rename
from worksheet.model.text import clean

VALUES = {"x": 0.75, "y": 3.0, "load": 1.2e-12, "a.gain": 7.5, "b_2.gain": -2.5}
SYMPY = {"sqrt": sympy.sqrt, "log": sympy.log, "exp": sympy.exp, "min": sympy.Min, "max": sympy.Max, "abs": sympy.Abs}


def value_of(text: str) -> Any:
    return evaluate(parse(text), VALUES.__getitem__)


@pytest.mark.parametrize(("text", "expected"), [
    ("2*a.gain + 200e-15", 15.0 + 200e-15),
    ("-y**2", -9.0),
    ("(-y)**2", 9.0),
    ("2**3**2", 512.0),
    ("2**-1", 0.5),
    ("-2**-2", -0.25),
    ("8 - 4 - 2", 2.0),
    ("8/4/2", 1.0),
    ("8/4*2", 4.0),
    ("1 + 2*3", 7.0),
    ("(1 + 2)*3", 9.0),
    ("--y", 3.0),
    ("+y", 3.0),
    ("2*-y", -6.0),
    ("sqrt(16)", 4.0),
    ("log(exp(2))", 2.0),
    ("min(y, 2, x)", 0.75),
    ("max(y, 2, x)", 3.0),
    ("abs(b_2.gain)", 2.5),
    ("2*pi*y", 6.0 * math.pi),
    (".5 + 5.", 5.5),
    ("1E3 + 1e+3", 2000.0),
    ("\tx\r\n +\n1 ", 1.75),
])  # fmt: skip
def test_a_formula_is_read_as_ordinary_mathematics(text: str, expected: float) -> None:
    assert value_of(text) == pytest.approx(expected, rel=1e-15)


def test_the_tree_is_plain_tuples_with_the_names_in_order() -> None:
    found = parse("max(b_2.gain, -load) / (load - b_2.gain)**2")
    assert found == Formula(
        "max(b_2.gain, -load) / (load - b_2.gain)**2",
        (
            "/",
            ("call", "max", ("name", "b_2.gain"), ("neg", ("name", "load"))),
            ("**", ("-", ("name", "load"), ("name", "b_2.gain")), ("number", 2.0)),
        ),
        ("b_2.gain", "load"),
    )


def test_sheets_may_be_named_like_functions_and_constants() -> None:
    assert parse("pi.gain + min.gain*pi").names == ("pi.gain", "min.gain")


def test_a_name_is_looked_up_once() -> None:
    asked: list[str] = []

    def lookup(name: str) -> float:
        asked.append(name)
        return VALUES[name]

    evaluate(parse("x*x + y/x"), lookup)
    assert asked == ["x", "y"]


def test_what_a_lookup_raises_passes_through() -> None:
    with pytest.raises(KeyError):
        value_of("nowhere + 1")


REFUSED = [
    ("", 0, "The formula is empty."),
    (" ", 0, "The formula is empty."),
    ("x^2", 1, '"^" has no meaning in a formula: write "**" for a power.'),
    ("x\u00b7y", 1, '"·" has no meaning in a formula: write "*" for a product.'),
    ("x < y < 3", 2, '"<" has no meaning in a formula: comparisons are not read.'),
    ("x == y", 2, '"=" has no meaning in a formula: comparisons and assignments are not read.'),
    ("5 %", 2, '"%" has no meaning in a formula: write a percentage as a number, 5 % as "0.05".'),
    ("a.b.c", 3, '"." has no meaning in a formula: a dot stands once, between a sheet and one of its names.'),
    ("x // y", 3, 'A number, a name or a parenthesis should stand here, not "/".'),
    ("x[0]", 1, '"[" has no meaning in a formula.'),
    ("x\u202ey", 1, '"\ufffd" has no meaning in a formula.'),
    ("größe", 2, '"ö" has no meaning in a formula.'),
    ("__import__('os')", 11, '"\'" has no meaning in a formula.'),
    ("eval(x)", 0, '"eval" is not a function; the functions are sqrt, log, exp, min, max, abs.'),
    ("sqr(x)", 0, '"sqr" is not a function; did you mean sqrt?'),
    ("a.sqrt(x)", 0, '"a.sqrt" is not a function; did you mean sqrt?'),
    ("pi(2)", 0, '"pi" is not a function; the functions are sqrt, log, exp, min, max, abs.'),
    ("x + sqrt", 4, "sqrt is a function; its arguments are missing."),
    ("sqrt(x, y)", 0, "sqrt takes one argument, not 2."),
    ("min(x)", 0, "min takes at least two arguments, not 1."),
    ("sqrt()", 5, 'A number, a name or a parenthesis should stand here, not ")".'),
    ("2x", 1, 'An operator is missing before "x".'),
    ("x y", 2, 'An operator is missing before "y".'),
    ("x if y", 2, 'An operator is missing before "if".'),
    ("max(x y)", 6, 'An operator is missing before "y".'),
    ("1_000", 1, 'An operator is missing before "_000".'),
    ("1.2.3", 3, 'An operator is missing before ".3".'),
    ("2(x)", 1, 'An operator is missing before "(".'),
    ("(x", 0, "A parenthesis is not closed."),
    ("x)", 1, "This parenthesis closes nothing."),
    ("x, y", 1, "A comma stands only between the arguments of a function."),
    ("x +", 3, "A number, a name or a parenthesis should stand here, not the end."),
    ("*x", 0, 'A number, a name or a parenthesis should stand here, not "*".'),
    ("x**65", 3, "The exponent is larger than 64."),
    ("x**-65", 3, "The exponent is larger than 64."),
    ("x**(8*9)", 4, "The exponent is larger than 64."),
    ("2**64**64", 5, "A constant lies outside 1e-60 to 1e60."),
    ("((x**8)**8)**2", 13, "The exponent is larger than 64."),
    ("1e61", 0, "A constant lies outside 1e-60 to 1e60."),
    ("x + 1e400", 4, "A constant lies outside 1e-60 to 1e60."),
    ("1e-400", 0, "A constant lies outside 1e-60 to 1e60."),
    ("1e40*1e40", 4, "A constant lies outside 1e-60 to 1e60."),
    ("exp(-1000)", 0, "A constant lies outside 1e-60 to 1e60."),
    ("1e-50**10", 5, "A constant lies outside 1e-60 to 1e60."),
    ("exp(1000)", 0, "A value in the formula is out of range."),
    ("1/(2 - 2)", 1, "The formula divides by zero."),
    ("x + log(0)", 4, "log has no real value there."),
    ("sqrt(-1)", 0, "sqrt has no real value there."),
    ("(-8)**0.5", 4, "The formula has no real, finite value here."),
    ("0**-1", 1, "The formula divides by zero."),
    ("x" * 1001, 1000, "The formula is longer than 1000 characters."),
    ("+".join("x" * 151), 299, "The formula has more than 300 numbers, names and operators."),
    ("(" * 41 + "x" + ")" * 41, 40, "The formula is nested deeper than 40 levels."),
    ("-" * 41 + "x", 40, "The formula is nested deeper than 40 levels."),
    ("x**" * 41 + "x", 121, "The formula is nested deeper than 40 levels."),
    ("abs(" * 41 + "x" + ")" * 41, 163, "The formula is nested deeper than 40 levels."),
]


@pytest.mark.parametrize(("text", "column", "message"), REFUSED, ids=range(len(REFUSED)))
def test_what_is_outside_the_grammar_is_refused_at_its_column(text: str, column: int, message: str) -> None:
    with pytest.raises(FormulaError) as caught:
        parse(text)
    assert (caught.value.column, str(caught.value)) == (column, message)


@pytest.mark.parametrize("text", [
    "+".join("x" * 150), "(" * 40 + "x" + ")" * 40, "-" * 40 + "x", "x**64", "(x**8)**8", "x**64*x**64", "1e60",
    "1e-60", "x**0.5", "x**y", "log(1)*x", "0*x", "1e-60 - 1e-60", "x" * 1000,
])  # fmt: skip
def test_what_is_just_inside_the_bounds_is_read(text: str) -> None:
    assert parse(text).text == text


@pytest.mark.parametrize(("text", "values", "message"), [
    ("x/y", {"x": 1.0, "y": 0.0}, "The formula divides by zero."),
    ("x/y", {"x": np.float64(1.0), "y": np.float64(0.0)}, "The formula divides by zero."),
    ("x**0.5", {"x": -1.0}, "The formula has no real, finite value here."),
    ("1/(x*x)", {"x": 1e200}, "The formula has no real, finite value here."),
    ("x**y", {"x": 1e200, "y": 9.0}, "A value in the formula is out of range."),
    ("exp(x)", {"x": 1e4}, "A value in the formula is out of range."),
    ("log(x)", {"x": 0.0}, "log has no real value there."),
    ("min(1, x)", {"x": math.nan}, "The formula has no real, finite value here."),
    ("1/x", {"x": math.inf}, "The formula has no real, finite value here."),
])  # fmt: skip
def test_plain_numbers_without_a_real_finite_value_are_an_error(
    text: str, values: dict[str, float], message: str
) -> None:
    with pytest.raises(FormulaError) as caught:
        evaluate(parse(text), values.__getitem__)
    assert str(caught.value) == message


def test_arrays_are_evaluated_element_by_element() -> None:
    values = {"x": np.array([1.0, 4.0, 9.0]), "y": np.array([[1.0], [2.0]])}
    functions: dict[str, Callable[..., Any]] = {
        "sqrt": np.sqrt, "log": np.log, "exp": np.exp, "abs": np.abs,
        "min": lambda *terms: np.minimum.reduce(np.broadcast_arrays(*terms)),
        "max": lambda *terms: np.maximum.reduce(np.broadcast_arrays(*terms)),
    }  # fmt: skip
    found = evaluate(parse("max(sqrt(x)*y, 3) - min(y, x, 2)/2"), values.__getitem__, functions)
    assert found.tolist() == [[2.5, 2.5, 2.5], [2.5, 3.0, 5.0]]


def test_symbols_are_evaluated_exactly() -> None:
    symbols = {"x": sympy.Symbol("x", positive=True), "a.gain": sympy.Symbol("g", positive=True)}
    found = evaluate(
        parse("sqrt(x**2)/2 + log(exp(a.gain)) + 0.1*pi"),
        symbols.__getitem__,
        SYMPY,
        number=lambda value: sympy.Rational(repr(value)),
        pi=sympy.pi,
    )
    assert sympy.simplify(found - (symbols["x"] / 2 + symbols["a.gain"] + sympy.pi / 10)) == 0


# Random formulas, with the same text read by Python (where precedence and association are the same) and by sympy.

NUMBERS = st.floats(min_value=1e-6, max_value=1e6).map(repr)
LEAVES = NUMBERS | st.sampled_from(["x", "y", "pi"])


def _grown(inner: st.SearchStrategy[str]) -> st.SearchStrategy[str]:
    pair = st.tuples(inner, inner)
    return st.one_of(
        pair.flatmap(lambda both: st.sampled_from([f"{both[0]} {sign} {both[1]}" for sign in ("+", "-", "*", "/")])),
        pair.map(lambda both: f"({both[0]}) * ({both[1]})"),
        pair.map(lambda both: f"max({both[0]}, {both[1]})"),
        st.tuples(inner, st.sampled_from(["2", "-1", "3", "0.5", "2**2"])).map(lambda both: f"({both[0]})**{both[1]}"),
        inner.map(lambda text: f"-{text}"),
        inner.map(lambda text: f"({text})"),
        inner.map(lambda text: f"sqrt(abs({text}))"),
    )


FORMULAS = st.recursive(LEAVES, _grown, max_leaves=12)


def _by_python(text: str) -> object:
    """Python's own reading of a text made of the common subset of both grammars."""
    # fabs takes no complex number, which Python makes on the way where ours ends
    names = {**FLOAT_FUNCTIONS, "abs": math.fabs, "pi": math.pi, "x": VALUES["x"], "y": VALUES["y"]}
    try:
        return eval(text.replace("2**2", "2.0**2.0"), {"__builtins__": {}}, names)
    except (ZeroDivisionError, OverflowError, TypeError):
        return None


@given(text=FORMULAS)
@example(text="-x**2*-y")
@example(text="x - y - x/y/2*x")
def test_a_formula_has_the_value_that_python_gives_it(text: str) -> None:
    expected = _by_python(text)
    try:
        found = value_of(text)
    except FormulaError as error:
        bounded = "outside 1e-60" in str(error) or "larger than 64" in str(error)
        assert bounded or not isinstance(expected, float) or not math.isfinite(expected)
    else:
        assert found == pytest.approx(expected, rel=1e-12)


MANY_DIGITS: dict[str, Callable[..., Any]] = {
    "sqrt": mpmath.sqrt, "log": mpmath.log, "exp": mpmath.exp, "min": min, "max": max, "abs": abs,
}  # fmt: skip


@given(text=FORMULAS)
def test_exact_symbols_agree_with_arithmetic_of_many_digits(text: str) -> None:
    with mpmath.workdps(400):  # constants reach from 1e-60 to 1e60, so that nothing cancels to less than 20 digits
        try:
            formula = parse(text)
            expected = evaluate(
                formula,
                lambda name: mpmath.mpf(repr(VALUES[name])),
                MANY_DIGITS,
                number=lambda value: mpmath.mpf(repr(value)),
                pi=+mpmath.pi,
            )
        except (FormulaError, TypeError):  # TypeError: an order of complex numbers
            return
        exact = evaluate(
            formula,
            lambda name: sympy.Rational(repr(VALUES[name])),
            SYMPY,
            number=lambda value: sympy.Rational(repr(value)),
            pi=sympy.pi,
        )
        found = mpmath.mpmathify(sympy.N(exact, 30))
        assert abs(found - expected) <= 1e-15 * abs(expected) + mpmath.mpf("1e-300")


WORDS = st.sampled_from(
    [*FUNCTIONS, *"()()()+-*/,.x1^%=<[]{}:;'\"\\@", "**", "pi", "a.b", "1e5", "1e", "0.5", " ", "\n", "lambda", "__"]
)


@given(text=st.lists(WORDS, max_size=400).map("".join) | st.text(max_size=200))
@example(text="(" * 1000)
@example(text="-" * 1000)
@example(text="sqrt(" * 200)
@example(text="x**" * 333)
@example(text="9**9**9**9")
@example(text="+".join(["x"] * 500))
@example(text="max(" + ",".join(["1"] * 400) + ")")
@example(text="\ud800")
def test_no_text_does_anything_but_be_read_or_refused(text: str) -> None:
    try:
        formula = parse(text)
    except FormulaError as error:
        assert clean(str(error)) == str(error)  # noqa: PT017
        assert 0 <= error.column <= len(text)  # noqa: PT017
    else:
        assert all(name in text for name in formula.names)
        assert isinstance(hash(formula), int)


def test_rename_of_a_sheet_touches_its_references_alone() -> None:
    text = "buf*buf.gain +  xbuf.gain*2e5/buf .x - buf.buf # §"
    assert rename(text, "buf", "stage_2") == "buf*stage_2.gain +  xbuf.gain*2e5/buf .x - stage_2.buf # §"


def test_rename_of_a_name_touches_whole_names_alone() -> None:
    text = "rate*a.rate + rate2 - 2e3*e3 + max(rate, max)"
    assert rename(text, "rate", "clock", what="name") == "clock*a.rate + rate2 - 2e3*e3 + max(clock, max)"
    assert rename(text, "a.rate", "a.clock", what="name") == "rate*a.clock + rate2 - 2e3*e3 + max(rate, max)"
    assert rename(text, "e3", "f", what="name") == "rate*a.rate + rate2 - 2e3*f + max(rate, max)"
    assert rename(text, "max", "top", what="name") == text


@given(text=st.lists(WORDS, max_size=60).map("".join), new=st.sampled_from(["q", "longer_name"]))
def test_rename_there_and_back_is_the_same_text(text: str, new: str) -> None:
    assert rename(rename(text, "a", new), new, "a") == text
