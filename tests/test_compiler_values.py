"""Expressions: dimensions, the bare zero, functions, texts, comparisons, as an author sees them."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.compiler.arithmetic import arithmetic, compare, finite, same
from platewright.compiler.expressions import evaluate, literal
from platewright.compiler.functions import CONSTANTS, FUNCTIONS
from platewright.compiler.mistakes import Mistake
from platewright.compiler.scope import Scope
from platewright.compiler.values import Quantity, Value, Vector, kind_of, spell, spell_number
from platewright.lang import tree, units, words
from platewright.lang.reader import read_value
from platewright.lang.source import Span
from support.scenes import mistake_in, value_of

SPAN = Span("v", 1, 1, 1, 2)
finite_floats = st.one_of(st.just(0.0), st.floats(1e-6, 1e6), st.floats(-1e6, -1e-6))
dimensions = st.sampled_from([units.NUMBER, units.LENGTH, units.AREA, units.ANGLE, units.MASS, units.TIME])
quantities = st.builds(Quantity, finite_floats, dimensions)


def value(text: str) -> Value:
    written, problems = read_value("v", text)
    assert written is not None, problems
    return evaluate(written, Scope(dict(CONSTANTS)))


def refused(text: str) -> str:
    written, problems = read_value("v", text)
    assert written is not None, problems
    with pytest.raises(Mistake) as caught:
        evaluate(written, Scope(dict(CONSTANTS)))
    assert caught.value.problem is not None
    return caught.value.problem.sentence


def at(operator: str) -> tree.Binary:
    number = tree.Number("1", "", SPAN)
    return tree.Binary(operator, number, number, SPAN)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("text", "spelt"),
    [
        ("1 inch", "25.4 mm"),
        ("25.4 mm", "25.4 mm"),
        ("1/2 inch", "12.7 mm"),
        ("2 cm * 3 cm", "600 mm2"),
        ("600 mm2 / 2 cm", "30 mm"),
        ("600 mm2 / 2 cm2", "3"),
        ("(2 mm) ^ 3", "8 mm3"),
        ("(2 mm) ^ -1", "0.5 [length^-1]"),
        ("root(9 mm2)", "3 mm"),
        ("1 + 2 * 3", "7"),
        ("(1 + 2) * 3", "9"),
        ("2 ^ 3 ^ 2", "512"),
        ("-2 ^ 2", "-4"),
        ("7 / 2", "3.5"),
        ("10 %", "0.1"),
        ("5 mm - 5 mm", "0 mm"),
        ("0 + 5 mm", "5 mm"),
        ("5 mm + 0", "5 mm"),
        ("0 * 5 mm", "0 mm"),
        ("-0", "0"),
        ("0 / 5 mm", "0 [length^-1]"),
        ("1 m + 1 mm", "1001 mm"),
        ("8.5 g/cm3 * 2 cm3", "17 g"),
        ("20 degC", "293.15 K"),
        ("1 h", "3600 s"),
        ("(1 mm, 2 mm, 3 mm)", "(1 mm, 2 mm, 3 mm)"),
        ("(0, 0, 3 mm)", "(0 mm, 0 mm, 3 mm)"),
        ("2 * (1 mm, 0, 3 mm)", "(2 mm, 0 mm, 6 mm)"),
        ("(1 mm, 0, 3 mm) * 2", "(2 mm, 0 mm, 6 mm)"),
        ("(2 mm, 4 mm) / 2 mm", "(1, 2)"),
        ("(1 mm, 2 mm) + (0, 0)", "(1 mm, 2 mm)"),
        ("(1 mm, 2 mm) - (1 mm, 2 mm)", "(0 mm, 0 mm)"),
        ("-(1 mm, 0, -3 mm)", "(-1 mm, 0 mm, 3 mm)"),
        ("1 mm .. 5 mm", "1 mm .. 5 mm"),
        ("0 .. 5 mm", "0 mm .. 5 mm"),
        ("3 mm if 2 > 1 else 4 mm", "3 mm"),
        ("3 mm if no else 4 mm", "4 mm"),
        ("yes", "yes"),
        ("not yes", "no"),
        ("yes and no", "no"),
        ("yes or no", "yes"),
        ("1 inch is 25.4 mm", "yes"),
        ("1 mm is not 2 mm", "yes"),
        ("0 is 0 mm", "yes"),
        ("(0, 0) is (0 mm, 0 mm)", "yes"),
        ("(1 mm, 0) is (1 mm, 0 mm)", "yes"),
        ('"a" is "a"', "yes"),
        ('"a" is "b"', "no"),
        ("1 mm < 1 inch", "yes"),
        ("0 <= 0 mm", "yes"),
        ("1 deg >= 61 arcmin", "no"),
        ("2026-06-21", "2026-06-21"),
        ('"{1 inch} wide"', '"25.4 mm wide"'),
        ('"{2 * 3} of {yes}"', '"6 of yes"'),
        ("pi", "3.141592654"),
    ],
)
def test_value(text: str, spelt: str) -> None:
    assert spell(value(text)) == spelt


@pytest.mark.parametrize(
    ("text", "spelt"),
    [
        ("sin(30 deg)", "0.5"),
        ("cos(60 deg)", "0.5"),
        ("tan(45 deg)", "1"),
        ("sin(180 deg)", "0"),
        ("cos(90 deg)", "0"),
        ("sin(0)", "0"),
        ("sin(pi * 1 rad / 6)", "0.5"),
        ("arcsin(0.5)", "30 deg"),
        ("arccos(0.5)", "60 deg"),
        ("arccos(-1)", "180 deg"),
        ("arctan(1)", "45 deg"),
        ("arctan(1 mm, 1 mm)", "45 deg"),
        ("arctan(-1 mm, 0)", "-90 deg"),
        ("arctan(0, -1 mm)", "180 deg"),
        ("root(2)", "1.414213562"),
        ("abs(-3 mm)", "3 mm"),
        ("min(2 mm, 3 mm, 1 inch)", "2 mm"),
        ("max(0, -3 mm)", "0 mm"),
        ("min(5 mm)", "5 mm"),
        ("floor(2.5)", "2"),
        ("floor(-2.5)", "-3"),
        ("ceiling(2.5)", "3"),
        ("floor(17 mm, 5 mm)", "15 mm"),
        ("ceiling(17 mm, 5 mm)", "20 mm"),
        ("round(17 mm, 5 mm)", "15 mm"),
        ("round(2.4)", "2"),
        ("round(2.5)", "2"),
        ("round(3.5)", "4"),
        ("round(0.49999999999999994)", "0"),
        ("length((3 mm, 4 mm, 0))", "5 mm"),
        ("length((3, 4))", "5"),
    ],
)
def test_function(text: str, spelt: str) -> None:
    assert spell(value(text)) == spelt


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("1 mm + 1", "`+` joins values of one kind, found a length and a number"),
        ("1 mm - 1 deg", "`-` joins values of one kind, found a length and an angle"),
        ("1 mm < 1 deg", "only values of one kind can be compared, found a length and an angle"),
        ('1 is "1"', "only values of one kind can be compared, found a number and a text"),
        ("(1 mm, 2 mm) is (1 mm, 2 mm, 3 mm)", "only values of one kind can be compared"),
        ('"a" + "b"', "`+` cannot join a text and a text"),
        ("yes + 1", "`+` cannot join yes or no and a number"),
        ("1 / (1 mm, 2 mm)", "`/` cannot join a number and a point of a plane"),
        ("(1 mm, 2 mm) * (1 mm, 2 mm)", "`*` cannot join"),
        ("not 1", "expected yes or no, found a number"),
        ("1 and yes", "expected yes or no, found a number"),
        ("1 if 2 else 3", "expected yes or no, found a number"),
        ('-"a"', "a sign needs a number, found a text"),
        ('"a" < "b"', "`<` compares two quantities, found a text"),
        ("(1 mm, 2 deg)", "the values of a point are of one kind: expected a length, found an angle"),
        ('(1 mm, "a")', "expected a value of a point, found a text"),
        ("2 ^ 1 mm", "expected a number as the power, found a length"),
        ("(1 mm) ^ 0.5", "a length can only be raised to a whole power up to 9"),
        ("1 mm .. 5 deg", "a range runs between values of one kind"),
        ("5 mm .. 1 mm", "the range ends before it starts: 5 mm .. 1 mm"),
        ("52 degN + 1 degN", "a latitude takes no part in arithmetic"),
        ("(52 degN, 52 degN) * 2", "a latitude takes no part in arithmetic"),
        ("sin(30)", "`sin` takes an angle, but was given a number"),
        ("sin()", "`sin` takes an angle, but was given 0 values"),
        ("arcsin(2)", "`arcsin` takes a number from -1 to 1, but was given 2"),
        ("tan(90 deg)", "`tan` has no value at 90 deg"),
        ("arctan(0, 0)", "`arctan` has no value for a rise and a run of 0"),
        ("min()", "`min` takes one or more values, but was given 0 values"),
        ("min(1 mm, 1 deg)", "`min` takes values of one kind, but was given a length and an angle"),
        ("round(1 mm)", "`round` takes a number, but was given a length"),
        ("round(5 mm, 0 mm)", "`round` takes a step above 0"),
        ("floor(1e300, 1e-300)", "the result is too large to be a number"),
        ("length(3 mm)", "`length` takes a point or a vector"),
        ("abs(value = 3)", "`abs` takes values in order, without names"),
        ("sin", "`sin` is a function of the language"),
        ("pi.x", "`pi` is a value; it has no `x`"),
        ("pi[1]", "`pi` is a single value; brackets count copies"),
        ("pi(1)", "`pi` is a number, not a function"),
        ("pj", "nothing here is called `pj`"),
        ("1e300 * 1e300", "the result is too large to be a number"),
        ("10 ^ 1e9", "the result is too large to be a number"),
    ],
)
def test_refused(text: str, sentence: str) -> None:
    assert sentence in refused(text)


def test_every_function_of_the_vocabulary_is_built_and_no_other() -> None:
    assert {each.name for each in words.FUNCTIONS if each.place == "values"} == set(FUNCTIONS)
    assert set(words.CONSTANTS) == set(CONSTANTS)
    for each in words.FUNCTIONS:
        if each.place == "values":
            assert kind_of(value(each.example))


def test_an_authors_function_with_names_and_defaults_of_its_own() -> None:
    derived = ("pitch(d) = 0.2 * d", "gap(a, base) = a - base", "twice(x) = pitch(x) + pitch(d = x)")
    assert value_of("pitch(5 mm)", *derived) == "1 mm"
    assert value_of("gap(base = 1 mm, a = 3 mm)", *derived) == "2 mm"
    assert value_of("twice(5 mm)", *derived) == "2 mm"
    assert "takes one value, found 2" in mistake_in("pitch(1, 2)", *derived).sentence
    assert "needs `base`" in mistake_in("gap(1)", *derived).sentence
    assert "given twice" in mistake_in("gap(1, a = 2)", *derived).sentence
    problem = mistake_in("gap(1, bsae = 2)", *derived)
    assert "no parameter `bsae`" in problem.sentence and problem.hint == "did you mean `base`?"
    problem = mistake_in("pitch", *derived)
    assert "is a function" in problem.sentence and "pitch(…)" in problem.hint


def test_a_choice_evaluates_only_the_branch_it_takes() -> None:
    assert value_of("1 if yes else 1 / 0") == "1"
    assert value_of("no and 1 / 0 > 1") == "no"
    assert value_of("yes or 1 / 0 > 1") == "yes"


@given(quantities, quantities)
def test_addition_needs_one_dimension_and_keeps_it(left: Quantity, right: Quantity) -> None:
    if left.dimension != right.dimension:
        with pytest.raises(Mistake):
            arithmetic("+", left, right, at("+"))
        return
    total = arithmetic("+", left, right, at("+"))
    assert total == arithmetic("+", right, left, at("+"))
    assert isinstance(total, Quantity) and total.dimension == left.dimension
    back = arithmetic("-", total, right, at("-"))
    assert isinstance(back, Quantity)
    assert math.isclose(back.value, left.value, rel_tol=1e-9, abs_tol=1e-9 * (1 + abs(right.value)))


@given(quantities, quantities)
def test_products_multiply_dimensions_and_quotients_undo_them(left: Quantity, right: Quantity) -> None:
    product = arithmetic("*", left, right, at("*"))
    assert isinstance(product, Quantity)
    assert product.dimension == left.dimension * right.dimension
    if right.value:
        back = arithmetic("/", product, right, at("/"))
        assert isinstance(back, Quantity) and back.dimension == left.dimension
        assert math.isclose(back.value, left.value, rel_tol=1e-12, abs_tol=1e-300)


@given(quantities, st.integers(-6, 6))
def test_whole_powers_are_repeated_products(base: Quantity, power: int) -> None:
    if base.value == 0 and power < 0:
        return
    raised = arithmetic("^", base, Quantity(float(power)), at("^"))
    assert isinstance(raised, Quantity)
    assert raised.dimension == base.dimension**power
    assert math.isclose(raised.value, base.value**power, rel_tol=1e-12, abs_tol=1e-300)


@given(quantities, quantities)
def test_no_result_is_minus_zero(left: Quantity, right: Quantity) -> None:
    for operator in "+-*/":
        if operator in "+-" and left.dimension != right.dimension:
            continue
        if operator == "/" and right.value == 0:
            continue
        result = arithmetic(operator, left, right, at(operator))
        assert isinstance(result, Quantity)
        assert math.copysign(1.0, result.value) == 1.0 or result.value < 0


@given(quantities, quantities)
def test_an_order_is_total_within_one_dimension(left: Quantity, right: Quantity) -> None:
    if left.dimension != right.dimension:
        with pytest.raises(Mistake):
            compare("<", left, right, SPAN)
        return
    assert compare("<", left, right, SPAN) + compare(">", left, right, SPAN) + same(left, right, SPAN) == 1
    assert compare("<=", left, right, SPAN) != compare(">", left, right, SPAN)
    assert compare("is not", left, right, SPAN) != compare("is", left, right, SPAN)


@given(quantities)
def test_the_bare_zero_fits_any_dimension(quantity: Quantity) -> None:
    zero = Quantity(0.0, units.NUMBER, True)
    assert arithmetic("+", zero, quantity, at("+")) == Quantity(quantity.value + 0.0, quantity.dimension)
    assert arithmetic("-", quantity, zero, at("-")) == Quantity(quantity.value + 0.0, quantity.dimension)
    assert compare("<", zero, quantity, SPAN) == (quantity.value > 0)
    named = Quantity(0.0, units.NUMBER)
    if quantity.dimension != units.NUMBER:
        with pytest.raises(Mistake):
            arithmetic("+", named, quantity, at("+"))


@given(st.floats(allow_nan=True, allow_infinity=True))
def test_only_numbers_are_let_through(number: float) -> None:
    if math.isfinite(number):
        assert finite(number, SPAN) == number
    else:
        with pytest.raises(Mistake):
            finite(number, SPAN)


@given(st.floats(-1e300, 1e300))
def test_a_number_is_spelt_to_ten_digits_without_minus_zero(number: float) -> None:
    spelt = spell_number(number)
    assert spelt != "-0"
    assert math.isclose(float(spelt), number, rel_tol=1e-9, abs_tol=1e-320)


@settings(max_examples=60)
@given(st.text("0123456789", min_size=1, max_size=12), st.integers(-(10**9), 10**9))
def test_no_written_number_takes_long(digits: str, power: int) -> None:
    try:
        found = literal(f"{digits}e{power}", "km", SPAN)
    except Mistake as caught:
        assert caught.problem is not None and caught.problem.code == "out-of-range"
        return
    assert math.isfinite(found.value)


@pytest.mark.parametrize("degrees", range(-720, 721, 15))
def test_sines_of_common_angles_are_exact_and_symmetric(degrees: int) -> None:
    sine, cosine = value(f"sin({degrees} deg)"), value(f"cos({degrees} deg)")
    assert isinstance(sine, Quantity) and isinstance(cosine, Quantity)
    turned = value(f"cos({90 - degrees} deg)")
    assert sine == turned
    for angle in (0, 30, 90):
        if degrees % 180 == angle:
            assert abs(sine.value) == {0: 0.0, 30: 0.5, 90: 1.0}[angle]


def test_kinds_are_named_in_an_authors_words() -> None:
    assert kind_of(value("(1, 2, 3)")) == "a direction"
    assert kind_of(value("(1 mm, 2 mm, 3 mm)")) == "a point"
    assert kind_of(value("1 mm2")) == "an area"
    assert kind_of(value("1:2")) == "a proportion"
    assert kind_of(Vector((1.0, 2.0), units.ANGLE)) == "a vector of angle"
