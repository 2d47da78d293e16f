"""Names that a fixed column was too narrow for: which full name each may stand for."""

from __future__ import annotations

import re
from collections.abc import Iterable

REFDES_WIDTH = 6

_NUMBERED = re.compile(r"(?P<base>.{2,}?)(?P<number>_\d{1,3})")
_REPLACED = re.compile(r"[^0-9a-z]")


def full_names(short: Iterable[str], full: Iterable[str], width: int) -> dict[str, str]:
    """Short names mapped to the full name that each can only stand for; exact ones are left out.

    Programs that truncate names to `width` characters keep either end of them, replace characters that they do not
    like, turn small letters into capitals, or number equal ones with `_1` (common practice). A short name that
    fits several full names, or several that fit the same one, are left as they are.
    """
    short, full = set(short), set(full)
    index: dict[tuple[str, str], set[str]] = {}
    for name in full - short:
        plain = _plain(name)
        index.setdefault(("whole", plain), set()).add(name)
        for kept in range(max(2, width - 4), width + 1) if len(name) > width else ():
            index.setdefault(("start", plain[:kept]), set()).add(name)
            index.setdefault(("end", plain[-kept:]), set()).add(name)
    found = {name: fits for name in short - full if (fits := _fits(name, index, width))}
    taken: dict[str, int] = {}
    for fits in found.values():
        for name in fits:
            taken[name] = taken.get(name, 0) + 1
    single = {name: next(iter(fits)) for name, fits in found.items() if len(fits) == 1}
    return {name: only for name, only in single.items() if taken[only] == 1}


def _fits(name: str, index: dict[tuple[str, str], set[str]], width: int) -> set[str]:
    plain = _plain(name)
    whole = index.get(("whole", plain))
    if whole:
        return whole
    fits: set[str] = set()
    if len(name) == width:
        fits |= index.get(("start", plain), set()) | index.get(("end", plain), set())
    numbered = _NUMBERED.fullmatch(name)
    if not fits and numbered and len(name) == width:
        base = _plain(numbered["base"])
        fits |= index.get(("start", base), set()) | index.get(("end", base), set())
    return fits


def _plain(name: str) -> str:
    return _REPLACED.sub("_", name.lower())
