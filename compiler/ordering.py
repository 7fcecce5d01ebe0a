"""An order in which each thing stands after those it depends on, and the circles that forbid one."""

from __future__ import annotations

from collections.abc import Mapping, Sequence


def order(depends: Mapping[str, Sequence[str]]) -> tuple[list[str], list[list[str]]]:
    """Names so that each stands after those it depends on, and the circles that make that impossible.

    Names in a circle, and names that depend on one, are left out of the order. Cost: linear.
    """
    done: dict[str, bool] = {}
    sequence: list[str] = []
    circles: list[list[str]] = []
    for start in depends:
        if start in done:
            continue
        trail: list[str] = [start]
        pending = [iter(depends[start])]
        inside = {start: 0}
        sound = [True]
        while pending:
            following = next(pending[-1], None)
            if following is None:
                finished = trail.pop()
                pending.pop()
                del inside[finished]
                is_sound = sound.pop()
                done[finished] = is_sound
                if is_sound:
                    sequence.append(finished)
                elif sound:
                    sound[-1] = False
            elif following in inside:
                circles.append([*trail[inside[following] :], following])
                sound[-1] = False
            elif following in done:
                sound[-1] = sound[-1] and done[following]
            elif following in depends:
                inside[following] = len(trail)
                trail.append(following)
                pending.append(iter(depends[following]))
                sound.append(True)
    return sequence, circles
