"""Floats and JSON as text."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from platewright.backend.write.numbers import json_text, number_text, number_texts, row_texts

FINITE = st.floats(allow_nan=False, allow_infinity=False)


@given(FINITE)
def test_a_float_reads_back_exactly(value: float) -> None:
    text = number_text(value)
    assert float(text) == value
    assert text != "-0" and not text.endswith(".0")


@given(st.lists(FINITE, max_size=30), st.one_of(st.none(), st.integers(0, 9)))
def test_an_array_is_spelled_as_its_floats_are(values: list[float], decimals: int | None) -> None:
    assert number_texts(np.array(values), decimals) == [number_text(value, decimals) for value in values]


@given(st.floats(-1e9, 1e9), st.integers(0, 9))
def test_fixed_decimals_are_kept_and_right_to_half_a_unit(value: float, decimals: int) -> None:
    text = number_text(value, decimals)
    assert len(text.partition(".")[2]) == decimals
    assert abs(float(text) - value) <= 0.5 * 10.0**-decimals + math.ulp(value)
    assert float(text) != 0 or "-" not in text


@pytest.mark.parametrize(
    ("value", "decimals", "text"),
    [
        (-0.0, None, "0"),
        (84.0, None, "84"),
        (0.1, None, "0.1"),
        (-1e-300, None, "-1e-300"),
        (1e22, None, "1e+22"),
        (np.float64(2.5), None, "2.5"),
        (-0.0004, 3, "0.000"),
        (-0.0006, 3, "-0.001"),
        (2.0, 2, "2.00"),
        (-0.4, 0, "0"),
    ],
)
def test_spelling(value: float, decimals: int | None, text: str) -> None:
    assert number_text(value, decimals) == text


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_what_is_not_finite_is_refused(value: float) -> None:
    for spell in (number_text, json_text, lambda number: number_texts(np.array([1.0, number]))):
        with pytest.raises(ValueError, match="may hold"):
            spell(value)


def test_rows_keep_their_numbers_together() -> None:
    assert row_texts(np.array([[1.0, -0.0, 2.5], [4.0, 5.0, 6.0]]), " ") == ["1 0 2.5", "4 5 6"]
    assert row_texts(np.empty((0, 3)), " ") == []


def test_json_keeps_order_and_escapes() -> None:
    value = {"b": [1, 2.0, -0.0, None, True], "a": {'Größe "1"\n': ()}, "t": (0.1, "x")}
    text = json_text(value)
    assert text == '{"b":[1,2,0,null,true],"a":{"Gr\\u00f6\\u00dfe \\"1\\"\\n":[]},"t":[0.1,"x"]}'
    assert json.loads(text) == {"b": [1, 2, 0, None, True], "a": {'Größe "1"\n': []}, "t": [0.1, "x"]}


def test_json_refuses_what_it_has_no_form_for() -> None:
    with pytest.raises(TypeError, match="set"):
        json_text({1})  # type: ignore[arg-type]
