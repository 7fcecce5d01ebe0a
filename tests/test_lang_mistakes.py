# ruff: noqa: E501
"""Typical mistakes of authors: each reported once, where it is, with the way out.

Each case is a scene, a rule, and what is reported: line, first column, code, sentence, and behind a bar the hint.
"""

from __future__ import annotations

import pytest
from platewright.lang.reader import read_scene

CASES = r"""
part can
    add cylnder diameter 60 mm length 50 mm
> 2:9 unknown-word: `cylnder` is no shape, and a part takes nothing like what follows it | did you mean `cylinder`?
---
part can
    add blok (1 mm, 1 mm, 1 mm)
> 2:9 unknown-word: `blok` is no shape, and no part is called so | did you mean `block`?
---
part can
    add box (1 mm, 1 mm, 1 mm)
> 2:9 unknown-word: `box` is no shape, and no part is called so | did you mean `block`?
---
part can
    add
        boxx (1 mm, 1 mm, 1 mm)
> 3:9 unknown-word: `boxx` is no shape, and no part is called so | shapes are `block`, `cylinder`, `cone`, `sphere`, `extrude`, `revolve` and others; a part is declared by `part boxx`
---
part can
    add rivets (4 mm, 1)
part rivet(d = 3 mm)
    add sphere diameter d
> 2:9 unknown-word: `rivets` is no shape, and no part is called so | did you mean `rivet`?
---
part can
    add rivet (4 mm, 1)
part rivet(d = 3 mm)
    add sphere diameter d
> 2:14 call-space: the parenthesis of a call touches its name | write `rivet(`, or `rivet at (` for a place
---
part can
    add sphere diameter 1 mn
> 2:27 unknown-unit: `mn` behind the number `1` is no unit | did you mean the unit `mm`?
---
part can
    add cylinder diametr 60 mm length 50 mm
> 2:18 unknown-word: `diametr` is not a word that stands here | did you mean `diameter`?
---
part can
    add cylinder diameter 60 mm lenght 50 mm
> 2:33 unknown-word: `lenght` is not a word that stands here | did you mean `length`?
---
part can
    add cylinder diameter 60 mm
> 2:32 missing-value: expected `length` behind `60 mm` | for example `cylinder diameter 20 mm length 8 mm`
---
part can
    add cylinder diameter length 50 mm
> 2:26 missing-value: expected a value behind `diameter`, found the word `length` | for example `cylinder diameter 20 mm length 8 mm`
---
part can
    add cylinder length 60 mm diameter 50 mm
> 2:17 missing-value: expected `diameter` behind `cylinder`, found `length` | `diameter` comes before `length`: for example `cylinder diameter 20 mm length 8 mm`
---
part can
    add cylinder lenght 3 mm diameter 5 mm
> 2:18 unknown-word: `lenght` is not a word that stands here | did you mean `length`? `diameter` comes before it
---
part can
    add cylinder radius 5 mm length 3 mm
> 2:17 missing-value: expected `diameter` behind `cylinder`, found `radius` | sizes are diameters, twice the radius: for example `cylinder diameter 20 mm length 8 mm`
---
figure f
    scale 0.5
> 2:11 wrong-form: expected `standard` or a scale like `1:2` behind `scale`, found `0.5` | for example `scale 1:2`
---
figure f
    drawn as shaded
> 2:13 missing-value: expected `lines`, `lines and tone`, `tints`, `stipple`, `tone`, `survey part`, `survey depth` or `survey facing` behind `as`, found `shaded` | for example `drawn as lines and tone`
---
part can
    add cone diameter 20 mm length 15 mm top 8 mm
> 2:42 misplaced-word: `top` may not stand here | `top` comes before `length`
---
figure f
    receiver journal
> 2:5 not-drawn-yet: `receiver` is a word of the language that is not drawn yet
---
part can
    color "#ff0000"
> 2:5 unknown-word: `color` is not a word that stands here | `colour` stands in a material; a part takes its material by `made of`
---
part can
    colour "#ff0000"
> 2:5 misplaced-word: `colour` may not stand here | it stands in a material; a part takes its material by `made of`
---
part can
    add sphere diameter 60mmm
> 2:27 unknown-unit: `mmm` behind the number `60` is no unit | did you mean the unit `mm`?
---
part can
    add sphere diameter 60 milimetre
> 2:28 unknown-unit: `milimetre` behind the number `60` is no unit | did you mean the unit `mm`?
---
part can
    add sphere diameter 0.5 in
> 2:25 unit-in: `in` is a unit only where it is glued to its number | write `0.5 inch` or `0.5in`
---
part can
    add sphere diameter .5 mm
> 2:25 bad-number: a number starts with a digit | write `0.5`
---
part can
    add sphere diameter 5. mm
> 2:25 bad-number: expected a digit behind the decimal point | write `5` or `5.0`
---
part can
    add sphere diameter "5 mm"
> 2:25 wrong-form: expected a length like `12 mm` behind `diameter`, found `"5 mm"` | for example `sphere diameter 12 mm`
---
part can
    add sphere diameter 5 mm 7 mm
> 2:30 value-too-many: nothing takes `7 mm` here | for example `add cylinder diameter 20 mm length 8 mm`
---
part can
    add block (10 mm, 20 mm)
> 2:15 wrong-form: expected a point `(x, y, z)` behind `block`, found `(10 mm, 20 mm)` | for example `block (40 mm, 20 mm, 5 mm)`
---
part can
    add block 10 mm, 20 mm, 5 mm
> 2:15 wrong-form: expected a point `(x, y, z)` behind `block`, found `10 mm, 20 mm, 5 mm` | put the values in parentheses
---
part can
    add block(10 mm, 20 mm, 5 mm)
> 2:9 call-space: the parenthesis behind the word `block` does not touch it | write `block (`
---
part can
    add sphere diameter 3 mm at(0, 0, 1 mm)
> 2:30 call-space: the parenthesis behind the word `at` does not touch it | write `at (`
---
part can
    add block (10 mm, 20 mm, 5 mm
> 2:34 unclosed-bracket: expected `)`: brackets close on their line | put `)` where the value ends
---
part can
    add sphere diameter 3 mm)
> 2:29 unopened-bracket: `)` closes nothing that is open
---
part can
    add block (10 mm 20 mm, 5 mm)
> 2:21 broken-value: expected a comma, an operator or the end of the value before `20 mm`
---
part can
    add sphere diameter 3 mm at (0,5 mm, 0, 1 mm)
> 2:35 comma-space: a comma is followed by a space | the decimal mark is a point, `0.5`; values of their own have a space between, `0, 5`
---
part can
    add sphere diameter 3 mm turn - 30 deg
> 2:35 sign-space: `turn` is a word here, and a sign touches its value | write `-` close to the value behind it
---
part can
    add cylinder diameter rim -3 mm length 5 mm
> 2:31 sign-space: a sign that touches its value starts a value of its own | for a difference write ` - ` with a space on both sides
---
part can
    add sphere diameter (rim -3 mm)
> 2:30 sign-space: a sign that touches its value starts a value of its own | for a difference write ` - ` with a space on both sides
---
part can
    add sphere diameter rim- 3 mm
> 2:28 sign-space: a sign touches its value, and a difference has a space on both sides or on neither | write ` - ` with a space on both sides
---
part can
    ad sphere diameter 5 mm
> 2:5 unknown-word: `ad` is not a word that stands here | did you mean `add`?
---
prat can
    add sphere diametr 5 mm
> 1:1 unknown-word: `prat` is not a word that stands here | did you mean `part`?
> 2:16 unknown-word: `diametr` is not a word that stands here | did you mean `diameter`?
---
part can
    add sphere diameter 5 mm ring 4 abuot z
> 2:37 unknown-word: `abuot` is not a word that stands here | did you mean `about`?
---
part can
    add sphere diameter 5 mm hole
> 2:30 misplaced-word: `hole` may not stand here | it stands in an outline
---
part can
    add
> 2:8 missing-value: expected a shape behind `add`, or shapes on the lines below | for example `add cylinder diameter 20 mm length 8 mm`
---
part can
    add sphere diameter 5 mm
        sphere diameter 6 mm
> 3:9 no-lines-here: `add` takes the shape on its own line or shapes on the lines below, not both
---
part can
    made of brass
        add sphere diameter 3 mm
> 3:9 no-lines-here: `made of` takes no lines under it | start this line in the column of the line above
---
part can
    add sphere diameter 3 mm
  add sphere diameter 4 mm
> 3:1 odd-indentation: this line is indented by 2, and the lines above it by 0 or 4 | indent by 4 spaces a level
---
part m
    add sphere diameter 5 mm
> 1:6 reserved-name: `m` is the unit metre and cannot be declared | call it `m_1`, or better
---
part block
    add sphere diameter 5 mm
> 1:6 reserved-name: `block` is a shape and cannot be declared | call it `block_1`, or better
---
part can(is = 3)
> 1:10 broken-value: expected a value behind `(`, found `is`
---
given
    a == 3 mm
> 2:7 foreign-operator: `==` is no operator of this language | equality is `is`; one `=` sets or defines
---
given
    a 3 mm
> 2:6 missing-value: expected `=` and a value behind `a` | for example `rim = 203 mm range 100 mm .. 400 mm`
---
given
    a: 3 mm
> 2:6 unexpected-character: the character `:` has no meaning here | write `=`
---
given
    a = 3 mm range 1 mm
> 2:20 wrong-form: expected a range like `1 mm .. 5 mm` behind `range`, found `1 mm` | for example `rim = 203 mm range 100 mm .. 400 mm`
---
derived
    b (d) = 0.2 * d
> 2:6 call-space: the parenthesis of a function's parameters touches its name | write `b(`
---
derived
    b = a < c < d
> 2:15 chained-comparison: a comparison cannot be compared again | join two comparisons by `and`
---
derived
    b = a if c
> 2:15 broken-value: expected `else` and a value | write `A if CONDITION else B`
---
derived
    b = 3 ** 2
> 2:11 foreign-operator: `**` is no operator of this language | write `^`
---
derived
    b = a && c
> 2:11 foreign-operator: `&&` is no operator of this language | write `and`
---
derived
    b = 3 *
> 2:12 broken-value: expected a value behind `*`, found the end of the line
---
derived
    b = 2026-02-30
> 2:9 bad-date: `2026-02-30` is no day of the calendar | a date is year-month-day, `2026-06-21`; a difference has spaces round its sign
---
derived
    b = 5 × 3
> 2:11 unexpected-character: the character `×` has no meaning here | write `*`
---
derived
    größe = 5 mm
> 2:7 unexpected-character: names are written with the letters a to z, digits and _, and `ö` is none of them
---
figure f
    alt A gauge
> 2:8 missing-value: expected a text in double quotes behind `alt`, found `A` | for example `alt "A rain gauge."`
---
figure f
    alt "A gauge
> 2:9 unclosed-text: this text has no closing quote on its line | close it; a long text goes on in a quoted text of its own on an indented line below
---
figure f
    alt “A gauge”
> 2:9 unexpected-character: the character `“` has no meaning here | write `"`
---
figure f
    alt "C:\temp"
> 2:12 bad-escape: `\t` means nothing in a text | the escapes are `\"`, `\\`, `\n`, `\{` and `\}`
---
figure f
    title "{rim"
> 2:16 unclosed-bracket: expected `}`: a value in a text stands in braces | close the brace; for the brace itself write `\{`
---
figure f
    drawn as tones
> 2:14 unknown-word: `tones` is not a word that stands here | did you mean `tone`?
---
figure f
    show gauge form front
> 2:16 unknown-word: `form` is not a word that stands here | did you mean `from`?
---
figure f
    with opened
> 2:9 missing-value: expected settings like `rim = 160 mm` behind `with`, found `opened` | for example `with opened = yes`
---
figure f
    width 80 mm
    width 90 mm
> 3:5 said-twice: `width` is said twice | keep one of the two
---
figure f
    items
> 2:5 not-drawn-yet: `items` is a word of the language that is not drawn yet
---
viewpoint v
    isometric from front above right
> 2:25 missing-value: expected `left` or `right` behind `front`, found `above` | for example `isometric from front right above`
---
viewpoint v
    eye (0, 0, 0) towards (1 mm, 0, 0)
> 2:19 unknown-word: `towards` is not a word that stands here | did you mean `toward`?
---
assembly a
    place at (0, 0, 50 mm)
> 2:10 missing-value: expected a value behind `place`, found the word `at` | for example `place lid at (0, 0, 50 mm)`
---
assembly a
    place lid (0, 0, 50 mm)
> 2:14 call-space: the parenthesis of a call touches its name | write `lid(`, or `lid at (` for a place
---
assembly a
    place lid at (0, 0, 50 mm), turn 30 deg
> 2:18 wrong-form: expected a point `(x, y, z)` behind `at`, found `(0, 0, 50 mm), turn` | no comma stands before the word `turn`
---
assembly a
    place lid at (0, 0, 1 mm) at (0, 0, 2 mm)
> 2:31 said-twice: `at` is said twice | keep one of the two
---
material b
    color "#ffffff"
> 2:5 unknown-word: `color` is not a word that stands here | did you mean `colour`?
---
material b
    gloss 60°
> 2:13 unexpected-character: the character `°` has no meaning here | write `deg`
---
outline w
    round to (1 mm, 2 mm)
> 2:26 missing-value: expected `radius`, `through` or `tangent` behind `(1 mm, 2 mm)` | for example `round to (0, 20 mm) radius 10 mm left`
---
lighting sunny
    sun elevation 30 deg
> 2:25 missing-value: expected `azimuth` behind `30 deg` | for example `sun elevation 40 deg azimuth 200 deg`
---
expect gauge
    distance(a, b) == 3 mm
> 2:20 foreign-operator: `==` is no operator of this language | equality is `is`; one `=` sets or defines
---
platewright 2
> 1:1 version: expected `platewright 1`, the version of the language that is known here
---
part can
    add sphere diameter 3 mm
platewright 1
> 3:1 version: the version of the language stands above everything else | move this line to the top
---
platewright 1
platewright 1
> 2:1 version: the version of the language is stated twice
---
see fasteners as f
> 1:4 missing-value: expected `library` or a text in double quotes behind `see`, found `fasteners` | for example `see library "fasteners" as fasteners`
---
block (1 mm, 1 mm, 1 mm)
> 1:1 misplaced-word: `block` may not stand here | it stands behind `add`, `cut` or `keep`
---
part can
    add sphere diameter 3 mm when x = 3
> 2:35 wrong-form: expected a condition, `yes` or `no` behind `when`, found `x = 3` | equality is written `is`
"""

TABLE = [case.partition("\n> ") for case in CASES.strip("\n").split("\n---\n")]


@pytest.mark.parametrize(("scene", "expected"), [(scene, "> " + rest) for scene, _, rest in TABLE])
def test_a_mistake_is_reported_where_it_is_with_a_way_out(scene: str, expected: str) -> None:
    problems = read_scene("a.plate", scene + "\n")[1]
    reported = [
        f"> {p.span.line}:{p.span.column} {p.code}: {p.sentence}" + (f" | {p.hint}" if p.hint else "") for p in problems
    ]
    assert "\n".join(reported) == expected


def test_the_table_is_worth_its_name() -> None:
    assert len(TABLE) >= 40
    hinted = [rest for _, _, rest in TABLE if " | " in rest]
    assert len(hinted) >= 0.85 * len(TABLE)


def test_mistakes_on_different_lines_are_all_reported_in_one_run() -> None:
    scenes = [scene for scene, _, rest in TABLE if rest.count("\n") == 0 and "platewright" not in scene]
    together = "\n".join(scenes) + "\n"
    problems = read_scene("a.plate", together)[1]
    assert len(problems) == len(scenes)
