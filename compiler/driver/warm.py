"""The warm-up: every kernel compiled once and kept, so that the first real drawing does not wait."""

from __future__ import annotations

import gc
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

from .crash import Trace
from .meshes import KeptMeshes
from .report import Report

if TYPE_CHECKING:
    from platewright.compiler.scene import Refusal

_NAME = "warm-up.plate"
_SELDOM = (100_000, 20, 20)
_SCENE = """\
platewright 1

part post
    add cylinder diameter 20 mm length 30 mm
    add block (26 mm, 8 mm, 10 mm) at (1 mm, 0, 12 mm)
    cut cylinder diameter 6 mm length 40 mm at (0, 0, -1 mm)

part bead
    add sphere diameter 12 mm
    add torus diameter 14 mm tube 3 mm

part bolt
    add thread M6 length 20 mm

part bar
    add block (30 mm, 5 mm, 5 mm)

assembly all
    place post
    place bead at (3 mm, -2 mm, 33 mm)
    place bolt at (0, 0, 20 mm) facing (1, -2, 1)
    place bar at (0, 0, 8 mm) facing (1, 1, 3)

viewpoint near
    eye (60 mm, -90 mm, 60 mm) toward (0, 0, 15 mm)

figure near_tone
    show post from near
    drawn as tone
    width 10 mm

figure tone
    show post
    drawn as tone
    width 10 mm

figure part
    show post
    drawn as survey part
    width 10 mm

figure depth
    show post
    drawn as survey depth
    width 10 mm

figure facing
    show post
    drawn as survey facing
    width 10 mm

figure lines
    show all
    drawn as lines
    hidden edges dashed
    width 30 mm

figure near_lines
    show all from near
    drawn as lines
    threads real
    width 30 mm

figure lines_over_tone
    show all from near
    drawn as lines and tone
    width 30 mm

figure section
    show all from front
    section across y at 0
    drawn as lines
    width 30 mm

figure tints
    show all
    drawn as tints
    width 30 mm

figure stipple
    show all
    drawn as stipple
    width 30 mm
"""


@contextmanager
def compiling_told(report: Report) -> Iterator[None]:
    """Within the block, say when kernels have to be compiled before something is drawn. Imports numba.

    From the first of them to the end of the block garbage is collected seldom: compiling makes much that stays, and
    going through it again and again would cost a sixth of the wait.
    """
    from numba.core.event import Event, Listener, install_listener

    class Notice(Listener):
        """Kernels that are read from numba's cache cause no event."""

        def on_start(self, event: Event) -> None:
            gc.set_threshold(*_SELDOM)
            report.message_once("compiling the drawing kernels for this machine, which happens once")

        def on_end(self, event: Event) -> None:
            pass

    usual = gc.get_threshold()
    try:
        with install_listener("numba:compile", Notice()):
            yield
    finally:
        gc.set_threshold(*usual)


def warm_up(trace: Trace, report: Report) -> int:
    """Draw a small scene of our own in every style and both projections; only the kernels are kept. Returns 0."""
    from platewright.backend import sheet
    from platewright.compiler.scene import Refusal, build, open_scene, plan

    def load(name: str) -> bytes | Refusal:
        return _SCENE.encode() if name == _NAME else Refusal("missing")

    trace.stage = "warming up"
    project, problems = open_scene(_NAME, load)
    model = None if project is None else build(project)[0]
    if model is None:
        raise AssertionError(f"the warm-up scene does not build: {problems}")
    with compiling_told(report), report.progress(len(model.figures)) as steps:
        for figure in model.figures:
            steps.begin(figure.name)
            job, problems = plan(model, figure.name, KeptMeshes(), resolution=100.0, measures=True)
            if job is None:
                raise AssertionError(f"the warm-up scene does not draw: {problems}")
            sheet.draw(job, ("svg", "png", "tiff"))
    report.message("the drawing kernels are ready")
    return 0
