"""Results of blocks by content: what was solved before, in this process or an earlier one, is not solved again."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import msgspec

from reactance.analysis.values import Value

Results = dict[str, Value]
_DECODER = msgspec.msgpack.Decoder(dict[str, Results])


class Solved:
    """A bounded store of block results by key. Not thread-safe: one analysis at a time uses it."""

    def __init__(self, most: int = 50_000) -> None:
        self._most = most
        self._known: dict[str, Results] = {}
        self._fresh: dict[str, Results] = {}
        self.reused = 0
        self.computed = 0

    def get(self, key: str, solve: Callable[[], Results]) -> Results:
        """The results under `key`, from the store or from `solve`."""
        found = self._known.get(key)
        if found is not None:
            self.reused += 1
            return found
        self.computed += 1
        results = solve()
        self._known[key] = results
        self._fresh[key] = results
        if len(self._known) > self._most:
            for old in list(self._known)[: self._most // 10]:
                del self._known[old]
        return results

    def take_fresh(self) -> bytes:
        """Results computed since the last call, encoded, for keeping; empty where there are none."""
        fresh, self._fresh = self._fresh, {}
        return msgspec.msgpack.encode(fresh) if fresh else b""

    def add(self, data: bytes) -> None:
        """Take in results that `take_fresh` encoded; what cannot be read is ignored, since it can be recomputed."""
        try:
            known: Mapping[str, Results] = _DECODER.decode(data)
        except msgspec.DecodeError:
            return
        self._known.update(known)
