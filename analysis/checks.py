"""From a figure to a judgement: limit, margin, status."""

from __future__ import annotations

import math

from reactance.analysis.circuit.spread import wilson_interval
from reactance.analysis.measures import find_measure
from reactance.analysis.report import Check, Limit, Status, Yield
from reactance.analysis.values import Value

ROUNDING = 1e-9  # a figure this near its limit, relatively, keeps it: solving is not exact to the last bit


def judge(check_id: str, scope: str, name: str, value: Value, limit: Limit | None) -> Check:
    """The check of `value` against `limit`; a figure that is missing makes it `unknown`."""
    find_measure(scope, name)
    return Check(
        id=check_id,
        measure=name,
        nominal=value.nominal,
        low=value.low,
        high=value.high,
        unit=value.unit,
        limit=limit,
        margin=margin(value, limit),
        status=status(value, limit),
        explain=explain(value),
        yield_=sample_yield(value, limit),
    )


def sample_yield(value: Value, limit: Limit | None) -> Yield | None:
    """The share of samples within the limit with Wilson's 95 % interval; None without samples or limit."""
    if limit is None or not value.samples:
        return None
    good = sum(math.isfinite(sample) and _distance(sample, limit) >= 0 for sample in value.samples)
    count = len(value.samples)
    return Yield(good / count, *wilson_interval(good, count), count)


def status(value: Value, limit: Limit | None) -> Status:
    """pass: the whole band keeps the limit; marginal: the nominal does; fail: it does not."""
    if value.nominal is None:
        return "unknown"
    if limit is None:
        return "watched"
    if _distance(value.nominal, limit) < 0:
        return "fail"
    ends = (_end(value.low, -math.inf), _end(value.high, math.inf))
    return "pass" if all(_distance(end, limit) >= 0 for end in ends) else "marginal"


def margin(value: Value, limit: Limit | None) -> float | None:
    """Least distance to a limit over the band, in shares of that limit; for a limit of 0 the distance itself."""
    if value.nominal is None or limit is None:
        return None
    ends = (value.nominal, _end(value.low, -math.inf), _end(value.high, math.inf))
    least = min(_raw_distance(end, limit) for end in ends)
    return least if math.isfinite(least) else None


def _end(value: float | None, infinite: float) -> float:
    return infinite if value is None else value


def _raw_distance(value: float, limit: Limit) -> float:
    distances = []
    for bound, sign in ((limit.max, 1.0), (limit.min, -1.0)):
        if bound is not None:
            distances.append(sign * (bound - value) / (abs(bound) or 1.0) + 0.0)  # no −0
    return min(distances)


def _distance(value: float, limit: Limit) -> float:
    distance = _raw_distance(value, limit)
    return 0.0 if abs(distance) <= ROUNDING else distance


def explain(value: Value) -> str:
    """One line: why there is no figure, or what it is made of and which parts matter most."""
    if not value.known:
        return value.missing
    pieces = [value.note] if value.note else []
    if value.matters:
        named = ", ".join(f"{part} {share:.0%}" for part, share in value.matters)
        pieces.append(f"spread mostly by {named}")
    return "; ".join(pieces)
