"""A response as poles and residues: H(s) = Σ r/(s − p) + d + e·s.

Poles come to full precision from roots.py. The residue of a pole that stands alone is a mean of H around a small circle
about it; poles that lie too close together for that (or coincide: then the network has no full set of eigenvectors)
are taken as one group, whose part of H is Cauchy's integral over a circle around the group, by the trapezoidal rule,
which converges geometrically (Trefethen and Weideman, SIAM Rev. 56 (2014) 385). The nodes of that rule are themselves
written as poles and residues, so that everything downstream sees one form and no difference of nearly equal terms.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.network import CircuitError, ComplexArray, FloatArray, Network, Parameter
from reactance.analysis.circuit.system import NEAR_INFINITY, NEAR_ZERO, Drive, System

_SINGLE_NODES = 8
_GROUP_NODES = 32


@dataclass(frozen=True, slots=True)
class PoleResidue:
    """H(s) = Σ residues/(s − poles) + direct + s·slope.

    Shapes: poles and residues complex (n,), direct and slope floats; with sets of values (V, n) and (V,). A pole
    that a set of values lacks has residue 0. Poles of the network that the response does not show may appear with a
    residue of about 0, a group of nearly equal poles as the nodes of a circle around it.
    """

    poles: ComplexArray
    residues: ComplexArray
    direct: FloatArray
    slope: FloatArray

    def at(self, s: ArrayLike) -> ComplexArray:
        """H at complex s (F,): (F,) or (V, F)."""
        points = np.asarray(s, complex)
        terms = self.residues[..., None, :] / (points[:, None] - self.poles[..., None, :])
        direct, slope = np.asarray(self.direct)[..., None], np.asarray(self.slope)[..., None]
        return np.asarray(terms.sum(axis=-1) + direct + points * slope)

    @property
    def batched(self) -> bool:
        """Whether there is a leading axis of sets of values."""
        return self.poles.ndim == 2

    def scaled(self, factor: ArrayLike) -> PoleResidue:
        """H times a real factor, a number or (V,)."""
        k = np.asarray(factor, float)
        return PoleResidue(self.poles, self.residues * k[..., None], self.direct * k, self.slope * k)


def pole_residue(
    network: Network,
    source: str,
    probe: str | tuple[str, str],
    *,
    parameters: Sequence[Parameter] = (),
    values: ArrayLike | None = None,
    family: Family | None = None,
) -> PoleResidue:
    """Poles and residues of the response at `probe` to `source`, all other sources at zero.

    `values` (V, P) of `parameters` gives a leading axis V to every array. Raises `CircuitError` where the network has
    no unique solution or a measured part has no fit. `family`, of the same network and parameters, is for many calls.
    """
    found = expand(family or Family(network, parameters), source, probe, values)
    return found if values is not None else first(found)


def first(found: PoleResidue) -> PoleResidue:
    """The first set of values alone, without the leading axis."""
    return PoleResidue(found.poles[0], found.residues[0], found.direct[0], found.slope[0])


def expand(
    family: Family, source: str | None, probe: str | tuple[str, str], values: ArrayLike | None
) -> PoleResidue:
    """Poles and residues (V, n) of the probe's response to one source, or (None) to all at their DC levels."""
    grid = None if values is None else np.asarray(values, float)
    system = family.system(grid, over_time=True)
    drive, probe = system.drive(source), system.probe(probe)
    found = family.poles(grid)
    poles, at_zero = found.roots, found.at_zero
    poles, residues = residues_at(poles, lambda s: system.respond(s, drive, probe))
    ends = np.array([[NEAR_ZERO, NEAR_INFINITY]], complex)
    low, high = system.respond(ends, drive, probe).T
    if at_zero and (np.abs(low) > 1e20).any():
        drift = low * NEAR_ZERO
        if (np.abs(drift) > 1e20).any():
            raise CircuitError("the response to a constant source grows faster than a ramp")
        poles = np.concatenate([poles, np.zeros((len(poles), 1))], axis=1)
        residues = np.concatenate([residues, drift[:, None]], axis=1)
    slope = np.where(np.abs(high) > 1e20, high.real / NEAR_INFINITY, 0.0)
    direct = np.where(np.abs(high) < 1e-20, 0.0, high.real)
    bare = PoleResidue(poles, residues, direct, slope)
    return _judge(system, drive, probe, _with_direct(system, drive, probe, bare))


def _with_direct(system: System, drive: Drive, probe: tuple[str, str], found: PoleResidue) -> PoleResidue:
    """Where H grows without bound its constant part shows on a circle around all poles."""
    if not found.slope.any():
        return found
    radius = 10.0 * max(float(np.abs(found.poles).max(initial=0.0)), 1e-6)
    circle = (radius * np.exp(2j * np.pi * (np.arange(8) + 0.5) / 8))[None, :]
    bare = PoleResidue(found.poles, found.residues, np.zeros(len(found.slope)), found.slope)
    rest = (system.respond(circle, drive, probe) - bare.at(circle[0])).mean(axis=1).real
    return PoleResidue(found.poles, found.residues, np.where(found.slope != 0, rest, found.direct), found.slope)


def _judge(system: System, drive: Drive, probe: tuple[str, str], found: PoleResidue) -> PoleResidue:
    """`found`, if it agrees with the network's own equations between and beyond its poles."""
    size = np.abs(found.poles[found.poles != 0])
    low, high = (size.min(), size.max()) if size.size else (1.0, 1.0)
    s = 1j * np.geomspace(low / 10, high * 10, 12)
    direct = system.respond(s[None, :], drive, probe)
    miss = np.abs(found.at(s) - direct).max(axis=1)
    if (miss > 1e-6 * np.abs(direct).max(axis=1)).any():
        raise CircuitError("the network's poles lie too close together to be told apart")
    return found


def residues_at(
    poles: ComplexArray, respond: Callable[[ComplexArray], ComplexArray]
) -> tuple[ComplexArray, ComplexArray]:
    """Poles (V, n') and residues of a response, given its poles (V, n): groups of poles become circles.

    `respond` gives the response (V, F) at s (V, F). NaN among the poles stands for none.
    """
    missing = np.isnan(poles)
    poles = np.where(missing, -1.0, poles)
    if not poles.shape[1]:
        return poles, poles
    groups = [_groups(row, gone) for row, gone in zip(poles, missing, strict=True)]
    single = poles.copy()
    radius = 0.03 * _clearance(poles, missing)
    turn = np.exp(2j * np.pi * (np.arange(_SINGLE_NODES) + 0.5) / _SINGLE_NODES)
    alone = np.zeros(poles.shape, complex)
    upper = np.flatnonzero((poles.imag >= 0).any(axis=0))
    offset = radius[:, upper, None] * turn
    points = (single[:, upper, None] + offset).reshape(len(poles), -1)
    around = respond(points).reshape(offset.shape)
    alone[:, upper] = (around * offset).mean(axis=-1)
    alone = _share_conjugates(poles, alone)
    alone = np.where(missing, 0.0, alone)
    if not any(groups):
        return poles, alone
    return _with_groups(respond, poles, alone, groups)


def _share_conjugates(poles: ComplexArray, residues: ComplexArray) -> ComplexArray:
    """The residue of a pole below the axis is the conjugate of its partner's; that of a real pole is real."""
    partner = np.abs(poles[:, :, None].conj() - poles[:, None, :]).argmin(axis=2)
    shared = np.take_along_axis(residues, partner, axis=1).conj()
    residues = np.where(poles.imag < 0, shared, residues)
    return np.asarray(np.where(poles.imag == 0, residues.real, residues))


def _clearance(poles: ComplexArray, missing: NDArray[np.bool_]) -> FloatArray:
    """Distance from each pole to the nearest other one, or to 0."""
    distance = np.abs(poles[:, :, None] - poles[:, None, :])
    n = poles.shape[1]
    distance[:, np.arange(n), np.arange(n)] = np.inf
    distance = np.where(missing[:, None, :], np.inf, distance)
    return np.asarray(np.maximum(np.minimum(distance.min(axis=2), np.abs(poles)), 1e-13 * np.abs(poles)))


@dataclass(frozen=True, slots=True)
class _Group:
    members: tuple[int, ...]
    centre: complex
    radius: float


def _groups(poles: ComplexArray, missing: NDArray[np.bool_]) -> list[_Group]:
    """Groups of poles too close together to be taken one by one."""
    usable = np.flatnonzero(~missing)
    p = poles[usable]
    near = np.abs(p[:, None] - p[None, :]) <= _closeness(p)[:, None]
    np.fill_diagonal(near, False)
    if not near.any():
        return []
    found: list[_Group] = []
    taken: set[int] = set()
    for seed in np.flatnonzero(near.any(axis=1)):
        if seed not in taken:
            group = _grow(p, {int(seed), *map(int, np.flatnonzero(near[seed]))})
            if group is not None and not taken & set(group.members):
                taken |= set(group.members)
                found.append(group)
    return [_Group(tuple(int(usable[i]) for i in g.members), g.centre, g.radius) for g in found]


def _closeness(p: ComplexArray) -> FloatArray:
    """Poles nearer than this are a group: a share of their size, less where they are hardly damped."""
    return np.minimum(2e-3 * np.abs(p), 0.1 * np.abs(p.real))


def _grow(p: ComplexArray, members: set[int]) -> _Group | None:
    """Take in neighbours until a circle fits that leaves members well inside and all others well outside."""
    while True:
        inside = np.array(sorted(members))
        centre = complex(p[inside].mean())
        if np.abs(p[inside].imag).max() < 0.3 * abs(centre.real) and abs(centre.imag) < 1e-6 * abs(centre):
            centre = complex(centre.real)
        extent = max(float(np.abs(p[inside] - centre).max()), 1e-7 * abs(centre))
        distance = np.abs(p - centre)
        distance[inside] = np.inf
        nearest = min(float(distance.min()), abs(centre))
        limit = 0.5 * abs(centre.real)
        radius = min(limit, 0.3 * nearest)
        if radius >= 3.0 * extent:
            return _Group(tuple(map(int, inside)), centre, radius)
        if not np.isfinite(distance.min()) or limit < 3.0 * extent:
            return None
        members = members | {int(distance.argmin())}


def _with_groups(
    respond: Callable[[ComplexArray], ComplexArray],
    poles: ComplexArray,
    residues: ComplexArray,
    groups: Sequence[Sequence[_Group]],
) -> tuple[ComplexArray, ComplexArray]:
    most = max(map(len, groups)) * _GROUP_NODES
    nodes = np.full((len(poles), most), -1.0 + 0j)
    weights = np.zeros((len(poles), most), complex)
    turn = np.exp(2j * np.pi * (np.arange(_GROUP_NODES) + 0.5) / _GROUP_NODES)
    residues = residues.copy()
    for row, found in enumerate(groups):
        for number, group in enumerate(found):
            span = slice(number * _GROUP_NODES, (number + 1) * _GROUP_NODES)
            nodes[row, span] = group.centre + group.radius * turn
            weights[row, span] = group.radius * turn / _GROUP_NODES
            residues[row, list(group.members)] = 0.0
    weights = weights * np.where(weights != 0, respond(nodes), 0.0)
    return np.concatenate([poles, nodes], axis=1), np.concatenate([residues, weights], axis=1)
