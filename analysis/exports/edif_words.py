"""Regular expressions over whole balanced forms, shared by the scan and by the pruning of graphics."""

from __future__ import annotations

BALANCED_DEPTH = 12
"""How many levels of brackets `BALANCED` follows; deeper forms take the slower way."""


def _contents(depth: int) -> str:
    """What may stand between a form's brackets when it nests at most `depth` levels deeper.

    Possessive throughout: the alternatives begin with different characters, so there is never a way back, and
    a form that does not match costs one pass for each level.
    """
    plain = r"[^()\"]*+"
    string = r"\"[^\"]*+\""
    pattern = rf"{plain}(?:{string}{plain})*+"
    for _ in range(depth):
        pattern = rf"{plain}(?:(?:{string}|\({pattern}\)){plain})*+"
    return pattern


BALANCED_CONTENTS = _contents(BALANCED_DEPTH - 1)
"""Pattern of what stands between the brackets of a form."""

BALANCED = rf"\({BALANCED_CONTENTS}\)"
"""Pattern of one whole form: brackets balanced outside strings."""
