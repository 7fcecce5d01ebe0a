"""Reading: lines a second with positions, against plain lark on the same text, and whether time grows as the lines do.

    python tests/bench/bench_parse.py [ROUNDS]

Ours is `read_scene`: layout, values, the vocabulary, spans on every node. Plain lark is an LALR grammar that only cuts
lines into words, numbers, texts and signs with the contextual lexer, and makes a tree with propagated positions, the
garbage collector off as it is for ours. Each figure is the least CPU time of the rounds, the sides taken in turn.
"""

from __future__ import annotations

import gc
import sys
import time
from collections.abc import Callable
from pathlib import Path

from lark import Lark
from platewright.lang.printer import format_text
from platewright.lang.reader import read_scene

sys.path.insert(0, str(Path(__file__).parents[1]))
from support.scene_texts import SAMPLE

MUST, AIM = 20_000, 50_000
PLAIN = r"""
start: (line? NEWLINE)*
line: (WORD | NUMBER | TEXT | SIGN)+
WORD: /[A-Za-z_][A-Za-z0-9_.]*/
NUMBER: /[0-9]+(\.[0-9]+)?/
TEXT: /"(?:[^"\\]|\\.)*"/
SIGN: /\.\.?|[<>]=?|[-+*\/^=(),\[\]%]/
NEWLINE: /\n/
COMMENT: /#[^\n]*/
%ignore / +/
%ignore COMMENT
"""


def scene(n_lines: int) -> str:
    """The sample again and again, up to about so many lines, its version stated once."""
    head, _, body = SAMPLE.partition("\n")
    body += "\n"
    return head + "\n" + body * (n_lines // body.count("\n"))


def cpu(work: Callable[[], object]) -> float:
    """CPU seconds of one run with the garbage collector off; what it made is freed outside the time."""
    gc.collect()
    gc.disable()
    start = time.process_time()
    made = work()
    taken = time.process_time() - start
    gc.enable()
    del made
    return taken


def main() -> None:
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 7
    plain = Lark(PLAIN, parser="lalr", propagate_positions=True)
    small, large = scene(5_000), scene(20_000)
    read_scene("warm", SAMPLE)
    times: dict[str, list[float]] = {"small": [], "large": [], "plain": [], "format": []}
    for _ in range(rounds):
        times["small"].append(cpu(lambda: read_scene("small", small)))
        times["large"].append(cpu(lambda: read_scene("large", large)))
        times["plain"].append(cpu(lambda: plain.parse(large)))
    times["format"].append(cpu(lambda: format_text("small", small)))
    least = {name: min(taken) for name, taken in times.items()}
    n_large, n_small = large.count("\n"), small.count("\n")
    rate = n_large / least["large"]
    growth = least["large"] / n_large / (least["small"] / n_small)
    print(f"read {n_large} lines: {least['large']:.2f} s, {rate:,.0f} lines/s (must {MUST:,}, aim {AIM:,})")
    print(f"plain lark on the same text: {least['plain']:.2f} s, {n_large / least['plain']:,.0f} lines/s")
    print(f"ours / plain lark: {least['large'] / least['plain']:.2f}")
    print(f"time a line at {n_large} lines / at {n_small} lines: {growth:.2f} (1 is linear)")
    print(f"format {n_small} lines, with its checks / reading them: {least['format'] / least['small']:.1f}")


if __name__ == "__main__":
    main()
