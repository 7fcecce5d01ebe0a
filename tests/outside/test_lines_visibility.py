"""Visibility of lines against rays.

Oracle: brute-force rays (Moeller and Trumbore 1997) over all triangles in world space, which shares nothing with the
engine (support/line_oracle.py). The rules of contact were found on the views `VIEWS`; `HELD_OUT` was looked at once, at
the end, and is kept in the slow run.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from platewright.backend import camera
from support import line_scenes
from support.line_oracle import score
from support.line_scenes import FORMS, HELD_OUT, TRAPS, VIEWS, Seen, fitted, fitted_central, mechanical, seen, trap

SAMPLES = 20_000
LONGEST_RUN = 0.2  # mm at 100 mm print size


def judged(found: Seen, n: int = SAMPLES) -> str:
    """Empty if right on at least 99.99 % of the samples and in no wrong run longer than 0.2 mm, else what was found."""
    result = score(found.view, found.candidates, found.pieces, n)
    is_right = result.n == n and result.right >= 0.9999 and result.longest_run <= LONGEST_RUN
    return "" if is_right else str(result)


def trapped(name: str, form: str, sight: tuple[float, float, float], n: int, is_held_out: bool = False) -> str:
    """Empty if at most one sure sample is wrong, else what was found."""
    geometry, projection = trap(name, form, sight, is_held_out)
    found = seen(geometry, projection)
    result = score(found.view, found.candidates, found.pieces, n)
    return "" if result.n == n and result.wrong <= 1 else str(result)


@pytest.mark.parametrize("name", ["parallel", "central"])
def test_mechanical_scene(name: str) -> None:
    geometry = mechanical(rung=0.2)
    fit = fitted if name == "parallel" else fitted_central
    assert judged(seen(geometry, fit(geometry, VIEWS["isometric"])), 4000) == ""


def test_an_eye_amid_the_parts() -> None:
    """Half of the scene lies behind the eye, and parts reach from before it to behind; the page is judged."""
    geometry = mechanical(rung=0.2)
    for eye, toward in (((100.0, 100.0, 60.0), (180.0, 180.0, 0.0)), ((100.0, 100.0, 12.0), (180.0, 140.0, 12.0))):
        found = seen(geometry, camera.central(eye, toward, 60.0, (60.0, 60.0)))
        assert len(found.view.faces) < len(geometry.faces)
        result = score(found.view, found.candidates, found.pieces, 2000, side=120.0)
        assert result.n == 2000 and result.wrong == 0, str(result)


@pytest.mark.slow
@pytest.mark.parametrize("name", ["parallel", "central"])
@pytest.mark.parametrize("rung", [0.05, 0.005])
def test_mechanical_scenes_at_full_count(name: str, rung: float) -> None:
    geometry = mechanical(rung=rung)
    fit = fitted if name == "parallel" else fitted_central
    for view in ("isometric", "oblique"):
        assert judged(seen(geometry, fit(geometry, VIEWS[view]))) == ""


@pytest.mark.slow
@pytest.mark.parametrize("name", ["parallel", "central"])
@pytest.mark.parametrize("n", [20_000, 100_000])
def test_smooth_bodies(name: str, n: int) -> None:
    geometry = line_scenes.smooth(n)
    fit = fitted if name == "parallel" else fitted_central
    assert judged(seen(geometry, fit(geometry, VIEWS["isometric"]))) == ""


@pytest.mark.parametrize("name", sorted(TRAPS))
def test_traps(name: str) -> None:
    failed = {}
    for form, view in (("as built", "isometric"), ("rotated, float32", "front"), ("central", "top")):
        wrong = trapped(name, form, VIEWS[view], 600)
        failed.update({(form, view): wrong} if wrong else {})
    assert failed == {}


@pytest.mark.slow
@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("name", sorted(TRAPS))
def test_traps_in_all_forms(name: str, form: str) -> None:
    wrong = {view: trapped(name, form, sight, SAMPLES) for view, sight in VIEWS.items()}
    assert {view: text for view, text in wrong.items() if text} == {}


@pytest.mark.slow
@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("name", sorted(TRAPS))
def test_traps_held_out(name: str, form: str) -> None:
    wrong = {view: trapped(name, form, sight, SAMPLES, True) for view, sight in HELD_OUT.items()}
    assert {view: text for view, text in wrong.items() if text} == {}


@pytest.mark.slow
def test_a_hundred_scenes_of_penetrating_parts() -> None:
    failed = {}
    for number in range(100):
        geometry = line_scenes.penetrating(seed=1000 + number, n=8, rung=0.2)
        random = np.random.default_rng(number)
        for _ in range(10):
            sight = random.normal(size=3)
            found = seen(geometry, fitted(geometry, tuple(sight)))
            result = score(found.view, found.candidates, found.pieces, 1000)
            if result.wrong > 1 or result.longest_run > LONGEST_RUN:
                failed[number, tuple(sight)] = str(result)
    assert failed == {}


def test_the_oracle_notices_damage() -> None:
    geometry = mechanical(rung=0.2)
    found = seen(geometry, fitted(geometry, VIEWS["isometric"]))
    is_visible = found.pieces.is_visible.copy()
    rows = np.flatnonzero(is_visible)
    is_visible[rows[:: len(rows) // 20]] = False
    damaged = replace(found, pieces=replace(found.pieces, is_visible=is_visible))
    assert "wrong" in judged(damaged, 4000)
    late = replace(found.view, tolerance=replace(found.view.tolerance, depth_mm=5.0))
    blunt = line_scenes.cut(late, found.candidates)
    result = score(found.view, found.candidates, blunt, 4000)
    assert result.wrong > 4
