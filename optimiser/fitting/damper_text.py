"""Numbers written into the text of a damper file, with every comment kept.

The text is edited line by line and the result read again: it must hold exactly the wanted changes,
or nothing is written. No files here; the damper's schema is not known here either.
"""

import re
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from optimiser.faults import BadInput

#: A place in a TOML file: keys and, for arrays of tables, positions from 0.
Place = tuple[str | int, ...]
_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\[\]]+?)\s*\]\]?\s*(#.*)?$")
_LINE = re.compile(
    r"^(?P<head>\s*(?P<key>[A-Za-z0-9_-]+)\s*=\s*)(?P<value>[^#\"'\[{]*?|\"[^\"]*\"|'[^']*')"
    r"(?P<gap>\s*)(?P<comment>#.*)?$"
)
#: Remark of an earlier fit, which a new one replaces.
_EARLIER = re.compile(r"(^|; )fit: .*$")


@dataclass(frozen=True)
class Change:
    """A new value for one key: ``value`` as TOML text, ``remark`` for the end of its line."""

    place: Place
    value: str
    remark: str


def edited(text: str, changes: Sequence[Change], heading: Sequence[str] = ()) -> str:
    """``text`` (TOML) with changes made and ``heading`` lines put on top as comments.

    A key that is missing is added to its table, a table that is missing to its parent's end. Raises
    BadInput when a value cannot be replaced because the file writes it in another way (in braces or
    with dotted keys).
    """
    lines = _without_heading(text.splitlines(), heading)
    for change in changes:
        lines = _with_change(lines, change)
    new = "\n".join([*(f"# {line}".rstrip() for line in heading), *lines]) + "\n"
    _check(text, new, changes)
    return new


def _without_heading(lines: list[str], heading: Sequence[str]) -> list[str]:
    """The lines below an earlier heading that begins with the same words."""
    if not heading or not lines or lines[0] != f"# {heading[0]}":
        return lines
    end = next((n for n, line in enumerate(lines) if line.strip() == "#"), -1)
    return lines[end + 1 :]


def _with_change(lines: list[str], change: Change) -> list[str]:
    places = _places(lines)
    table, key = change.place[:-1], str(change.place[-1])
    inside = [n for n, place in enumerate(places) if place == table]
    for number in inside:
        found = _LINE.match(lines[number])
        if found and found["key"] == key:
            return [*lines[:number], _replaced(found, change), *lines[number + 1 :]]
    new_line = f"{key} = {change.value}  # {change.remark}"
    if inside or not table:
        last = max((n for n in inside if _LINE.match(lines[n])), default=max(inside, default=-1))
        return [*lines[: last + 1], new_line, *lines[last + 1 :]]
    return _with_table(lines, places, table, new_line)


def _replaced(found: re.Match[str], change: Change) -> str:
    comment = (found["comment"] or "").lstrip("# ").strip()
    kept = _EARLIER.sub("", comment)
    remark = f"{kept}; {change.remark}" if kept else change.remark
    room = max(2, len(found["value"]) + len(found["gap"]) - len(change.value))
    return f"{found['head']}{change.value}{' ' * room}# {remark}"


def _with_table(lines: list[str], places: list[Place], table: Place, new_line: str) -> list[str]:
    """A missing table, added behind the last line of its parent and its parent's other tables."""
    parent = next((table[:k] for k in range(len(table) - 1, 0, -1) if table[:k] in places), ())
    members = [n for n, place in enumerate(places) if place[: len(parent)] == parent]
    last = max(n for n in members if lines[n].strip() and not lines[n].lstrip().startswith("#"))
    header = ".".join(str(step) for step in table if isinstance(step, str))
    return [*lines[: last + 1], "", f"[{header}]", new_line, *lines[last + 1 :]]


def _places(lines: Sequence[str]) -> list[Place]:
    """The table each line belongs to; a line inside a multi-line list keeps its table."""
    here: Place = ()
    counts: dict[Place, int] = {}
    places: list[Place] = []
    for line in lines:
        header = _HEADER.match(line)
        if header and "=" not in header[2] and '"' not in header[2]:
            here = _resolved(header[2], counts)
            if header[1] == "[[":
                counts[here] = counts.get(here, -1) + 1
                here = (*here, counts[here])
        places.append(here)
    return places


def _resolved(dotted: str, counts: Mapping[Place, int]) -> Place:
    """A header's keys, with the newest position behind each array of tables passed on the way."""
    steps = [step.strip() for step in dotted.split(".")]
    place: Place = ()
    for number, step in enumerate(steps):
        place = (*place, step)
        if place in counts and number < len(steps) - 1:
            place = (*place, counts[place])
    return place


def _check(old: str, new: str, changes: Sequence[Change]) -> None:
    """Raise BadInput unless ``new`` means ``old`` with the changes and nothing else."""
    wanted = tomllib.loads(old)
    for change in changes:
        _put(wanted, change.place, tomllib.loads(f"x = {change.value}")["x"])
    try:
        same = tomllib.loads(new) == wanted
    except tomllib.TOMLDecodeError:
        same = False
    if not same:
        keys = ", ".join(".".join(str(s) for s in change.place) for change in changes)
        raise BadInput(
            f"the damper file writes some of {keys} in braces or with dotted keys, which cannot be "
            "replaced; allowed: a table in square brackets and one key a line"
        )


def _put(data: Any, place: Place, value: object) -> None:
    for step in place[:-1]:
        data = data[step] if isinstance(step, int) else data.setdefault(step, {})
    data[place[-1]] = value
