"""Points and directions that a figure says by marks and features of its subject, or by values."""

from __future__ import annotations

from platewright.lang import tree
from platewright.lang.units import LENGTH

from .graph import Point, Thing
from .mistakes import mistake
from .paths import Placed, follow
from .placement import AXES, direction, point
from .scope import Scope
from .values import Value, Vector


def point_in(written: tree.Expression, subject: Thing, scope: Scope) -> Point:
    """A point in the subject's frame: values, or where a mark, a feature or a placed thing is. Raises Mistake."""
    if not isinstance(written, tree.Path) or scope.find(written.steps[0].name) is not None:
        return point(written, scope)
    value = _below(written, subject, scope)
    if not (isinstance(value, Vector) and value.dimension == LENGTH):
        raise mistake("wrong-kind", written.span, f"`{written.dotted}` is no point", "name a mark or a feature")
    x, y, z = value.components
    return (x, y, z)


def direction_in(written: tree.Expression, subject: Thing, scope: Scope) -> Point:
    """A unit direction: an axis, values, or the axis of a mark or feature of the subject. Raises Mistake."""
    if not isinstance(written, tree.Path) or (len(written.steps) == 1 and written.steps[0].name in AXES):
        return direction(written, scope)
    value = _below(written, subject, scope)
    if not (isinstance(value, Vector) and value.dimension != LENGTH):
        hint = "a mark set `along` something, and a feature, have an `axis`"
        raise mistake("wrong-kind", written.span, f"`{written.dotted}` is no direction", hint)
    x, y, z = value.components
    return (x, y, z)


def sight_in(written: tree.Expression, subject: Thing, scope: Scope) -> tuple[Point, Point | None]:
    """A unit direction of sight, and the point it is aimed at if any.

    A mark or feature is looked at along its axis from outside, against the way the axis points. Raises Mistake.
    """
    if not isinstance(written, tree.Path) or (len(written.steps) == 1 and written.steps[0].name in AXES):
        return direction(written, scope), None
    last = written.steps[-1].span
    axis = tree.Path((*written.steps, tree.Step("axis", None, last)), written.span)
    x, y, z = direction_in(axis, subject, scope)
    return (-x, -y, -z), point_in(written, subject, scope)


def holder_of(written: tree.Expression, subject: Thing, scope: Scope) -> str:
    """The path, within the subject, of the placed thing that holds a mark; `""` for the subject and for values."""
    if not isinstance(written, tree.Path) or scope.find(written.steps[0].name) is not None:
        return ""
    path = ""
    for length in range(1, len(written.steps) + 1):
        value = follow(subject, written.steps[:length], scope)
        if not isinstance(value, Placed):
            break
        path = value.path
    return path


def _below(written: tree.Path, subject: Thing, scope: Scope) -> Value:
    value = follow(subject, written.steps, scope)
    if isinstance(value, Placed):
        # A placed thing stands for its own origin.
        return Vector(tuple(row[3] for row in value.placement), LENGTH)
    return value
