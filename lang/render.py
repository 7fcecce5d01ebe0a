"""Problems as text with a caret, as JSON, and as SARIF 2.1.0, all from the same record. Plain text without colours."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from .codes import CODES
from .problems import Problem, Severity
from .source import Span

WIDTH = 140
"""Characters of a source line that an excerpt shows at most."""

JSON_SCHEMA_NUMBER = 1

_LEVELS: Mapping[Severity, str] = {Severity.ERROR: "error", Severity.WARNING: "warning", Severity.NOTE: "note"}


def render_text(problems: Iterable[Problem], sources: Mapping[str, str]) -> str:
    """Problems for a terminal, each with the line it is in, a caret under it, its hint and related places.

    `sources` maps the files that spans name to their texts; a file that is not there is named without an excerpt.
    """
    lines = {file: text.removeprefix("\ufeff").split("\n") for file, text in sources.items()}
    return "\n".join(_one(problem, lines) for problem in problems)


def _one(problem: Problem, sources: Mapping[str, list[str]]) -> str:
    lines = [f"{_where(problem.span)}: {problem.severity}: {problem.sentence} [{problem.code}]"]
    lines += _excerpt(problem.span, sources)
    if problem.within:
        lines.append(f"    in the figure {problem.within}")
    if problem.hint:
        lines.append(f"    hint: {problem.hint}")
    for related in problem.related:
        lines.append(f"    {_where(related.span)}: {related.words}")
        lines += _excerpt(related.span, sources)
    return "".join(line + "\n" for line in lines)


def _where(span: Span) -> str:
    return f"{span.file}:{span.line}:{span.column}"


def _excerpt(span: Span, sources: Mapping[str, list[str]]) -> list[str]:
    text = sources.get(span.file, [])
    if span.line > len(text):
        return []
    line = text[span.line - 1].removesuffix("\r")
    end = span.end_column if span.end_line == span.line else len(line) + 1
    start = span.column - 1
    n_carets = max(1, min(end, len(line) + 1) - span.column)
    left = max(0, start - WIDTH // 2) if len(line) > WIDTH else 0
    shown = "".join(letter if letter.isprintable() else " " for letter in line[left : left + WIDTH])
    carets = "^" * min(n_carets, max(1, WIDTH - (start - left)))
    number = str(span.line)
    gutter = " " * len(number)
    return [f" {number} | {shown}", f" {gutter} | {' ' * (start - left)}{carets}"]


def render_json(problems: Iterable[Problem]) -> str:
    """Problems as a JSON document: `{"schema": 1, "problems": [...]}`, lines and columns from 1, ends exclusive."""
    import json

    document = {"schema": JSON_SCHEMA_NUMBER, "problems": [_json(problem) for problem in problems]}
    return json.dumps(document, indent=2) + "\n"


def _json(problem: Problem) -> dict[str, Any]:
    return {
        "code": problem.code,
        "severity": str(problem.severity),
        "sentence": problem.sentence,
        "hint": problem.hint,
        "within": problem.within,
        **_json_span(problem.span),
        "related": [{"words": related.words, **_json_span(related.span)} for related in problem.related],
    }


def _json_span(span: Span) -> dict[str, Any]:
    return {
        "file": span.file,
        "line": span.line,
        "column": span.column,
        "end_line": span.end_line,
        "end_column": span.end_column,
    }


def render_sarif(problems: Iterable[Problem], version: str = "", codes: Mapping[str, str] = CODES) -> str:
    """Problems as a SARIF 2.1.0 log (OASIS standard, 2020): one run, one result a problem, rules from the codes.

    `version` is the version of platewright, left out if empty; `codes` gives each code its sentence. Columns count code
    points from 1.
    """
    import json

    results = [_result(problem) for problem in problems]
    used = sorted({result["ruleId"] for result in results})
    for result in results:
        result["ruleIndex"] = used.index(result["ruleId"])
    rules = [{"id": code, "shortDescription": {"text": codes.get(code, code)}} for code in used]
    driver: dict[str, Any] = {"name": "platewright", "rules": rules}
    if version:
        driver["version"] = version
    log = {
        "$schema": "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json",
        "version": "2.1.0",
        "runs": [
            {
                "tool": {"driver": driver},
                "columnKind": "unicodeCodePoints",
                "results": results,
            }
        ],
    }
    return json.dumps(log, indent=2) + "\n"


def _result(problem: Problem) -> dict[str, Any]:
    text = f"{problem.sentence}; hint: {problem.hint}" if problem.hint else problem.sentence
    result: dict[str, Any] = {
        "ruleId": problem.code,
        "level": _LEVELS[problem.severity],
        "message": {"text": text},
        "locations": [{"physicalLocation": _location(problem.span)}],
    }
    if problem.within:
        result["locations"][0]["logicalLocations"] = [{"name": problem.within, "kind": "member"}]
    if problem.related:
        result["relatedLocations"] = [
            {"id": i, "physicalLocation": _location(related.span), "message": {"text": related.words}}
            for i, related in enumerate(problem.related)
        ]
    return result


def _location(span: Span) -> dict[str, Any]:
    return {
        "artifactLocation": {"uri": _uri(span.file)},
        "region": {
            "startLine": span.line,
            "startColumn": span.column,
            "endLine": span.end_line,
            "endColumn": span.end_column,
        },
    }


def _uri(file: str) -> str:
    """A relative path as a URI reference (RFC 3986): what is not unreserved or a slash is percent-encoded."""
    safe = frozenset(b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-._~/")
    return "".join(
        chr(byte) if byte in safe else f"%{byte:02X}" for byte in file.replace("\\", "/").encode(errors="replace")
    )
