"""Five thousand broken exports, always the same: each becomes a Design or one InputError with a place."""

from __future__ import annotations

import pytest
from writers.fuzzing import SLOW, run


@pytest.mark.parametrize("first", range(5))
def test_broken_exports_are_read_or_refused(first: int) -> None:
    tally = run(first, 1000, step=5)
    assert tally.failures == []
    assert tally.slowest < SLOW
    assert tally.outcomes["read with problems"] > 50 and tally.outcomes["refused"] > 200
