"""Loose segments put in order along the curves they make up."""

from __future__ import annotations

import numpy as np

from ..compiled import kernel
from ..contract import I32
from .model import Bools
from .segments import fixed


def walked(ends: I32, n_joints: int) -> tuple[I32, Bools, I32]:
    """Segments in order along curves: (order, is_reversed, chain), each (k,).

    ends (k,2) int32: the joints that each segment runs between. A curve goes on through a joint of exactly two
    segments. Open curves come first; each starts at its end of the lowest row, a closed one at its lowest row.
    Cost: linear.
    """
    return _walked(fixed(ends), n_joints)


@kernel
def _walked(ends: I32, n_joints: int) -> tuple[I32, Bools, I32]:
    k = len(ends)
    count = np.zeros(n_joints, np.int32)
    at = np.full((n_joints, 2), -1, np.int32)
    for i in range(k):
        for side in range(2):
            joint = ends[i, side]
            if count[joint] < 2:
                at[joint, count[joint]] = i
            count[joint] += 1
    order, turned, chain = np.empty(k, np.int32), np.empty(k, np.bool_), np.empty(k, np.int32)
    is_used = np.zeros(k, np.bool_)
    n, n_chains = 0, 0
    for is_closed in (False, True):
        for first in range(k):
            if is_used[first]:
                continue
            is_back = False
            if not is_closed and count[ends[first, 0]] == 2:
                if count[ends[first, 1]] == 2:
                    continue
                is_back = True
            i = first
            while True:
                is_used[i] = True
                order[n], turned[n], chain[n] = i, is_back, n_chains
                n += 1
                joint = ends[i, 0 if is_back else 1]
                if count[joint] != 2:
                    break
                following = at[joint, 0] + at[joint, 1] - i
                if is_used[following]:
                    break
                i = following
                is_back = ends[i, 0] != joint
            n_chains += 1
    return order, turned, chain
