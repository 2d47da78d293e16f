"""Touchstone files written by scikit-rf from known parts give those parts back."""

from __future__ import annotations

from pathlib import Path
from types import MappingProxyType

import numpy as np
import pytest
import scipy.signal
import skrf
from numpy.typing import NDArray

from reactance.analysis.circuit.network import Bead, Capacitor
from reactance.analysis.design import Part, Pin, Place
from reactance.analysis.parts.knowledge import Connection, Knowledge, KnowledgeRow
from reactance.analysis.parts.measured import MeasuredPart
from reactance.analysis.parts.models import CapacitorModel, Conditions
from reactance.analysis.parts.resolve import resolve_part
from reactance.analysis.parts.touchstone import read_touchstone
from reactance.analysis.quantity import QuantityError

R, L, C = 7e-3, 0.8e-9, 4.7e-6
F = np.geomspace(1e3, 1e9, 301)
Complex = NDArray[np.complex128]


def rlc(f: NDArray[np.float64]) -> Complex:
    w = 2 * np.pi * f
    return np.asarray(R + 1j * w * L + 1 / (1j * w * C))


def network(z: Complex, connection: Connection, z0: float = 50.0) -> skrf.Network:
    """The part as scikit-rf's own lines make it: across a line, in a line, or at the end of one."""
    medium = skrf.media.DefinedGammaZ0(skrf.Frequency.from_f(F, unit="hz"), z0=z0, gamma=0)
    load = skrf.Network(f=F, s=((z - z0) / (z + z0)).reshape(-1, 1, 1), z0=z0, f_unit="hz")
    if connection == "one-port":
        return load
    if connection == "shunt":
        return medium.shunt(load)
    return medium.resistor(z)


def written(net: skrf.Network, folder: Path, **options: str) -> tuple[bytes, str]:
    net.write_touchstone("part", dir=folder, **options)
    (path,) = folder.glob("part.s*p")
    return path.read_bytes(), path.name


@pytest.mark.parametrize("connection", ["shunt", "series", "one-port"])
@pytest.mark.parametrize("form", ["ri", "ma", "db"])
@pytest.mark.parametrize("z0", [50.0, 1.0])
def test_the_known_impedance_comes_back(tmp_path: Path, connection: Connection, form: str, z0: float) -> None:
    content, name = written(network(rlc(F), connection, z0), tmp_path, form=form)
    measured = read_touchstone(content, name, connection)
    got = measured.impedance(np.asarray(measured.frequencies))
    assert np.max(np.abs(got / rlc(np.asarray(measured.frequencies)) - 1)) < 1e-9
    assert len(measured.frequencies) == len(F)


def test_version_2(tmp_path: Path) -> None:
    """Touchstone 2.0 (IBIS Open Forum, 2009): keywords, two-port data order 12_21, impedance by [Reference]."""
    s = network(rlc(F), "shunt").s
    lines = ["[Version] 2.0", "# Hz S RI R 50", "[Number of Ports] 2", "[Two-Port Data Order] 12_21"]
    lines += [f"[Number of Frequencies] {len(F)}", "[Reference] 50.0 50.0", "[Network Data]"]
    for f, m in zip(F, s, strict=True):
        order = (m[0, 0], m[0, 1], m[1, 0], m[1, 1])
        lines.append(" ".join([f"{f:.17g}", *(f"{x.real:.17g} {x.imag:.17g}" for x in order)]))
    measured = read_touchstone("\r\n".join([*lines, "[End]", ""]).encode(), "part.ts", "shunt")
    assert np.max(np.abs(np.asarray(measured.ohms) / rlc(F) - 1)) < 1e-9


def test_between_the_points_and_beyond_them() -> None:
    measured = MeasuredPart("part.s2p", tuple(F.tolist()), tuple(rlc(F).tolist()))
    between = np.sqrt(F[:-1] * F[1:])
    assert np.max(np.abs(measured.impedance(between) / rlc(between) - 1)) < 0.03
    assert measured.beyond([1e3, 1e9]) == ""
    assert "from 1 kHz to 1 GHz" in measured.beyond([1e2])
    outside = np.array([1.0, 1e2, 1e10, 1e11])
    assert np.max(np.abs(measured.impedance(outside) / rlc(outside) - 1)) < 1e-3
    assert measured.covers([10.0, 1e6, 1e10]).tolist() == [False, True, False]


def test_the_fit_of_a_known_part_has_its_step_response(tmp_path: Path) -> None:
    """A step through 1 ohm into the part, from scipy.signal for the known R, L, C and for those of the fit."""
    content, name = written(network(rlc(F), "shunt"), tmp_path)
    fit = read_touchstone(content, name, "shunt").fit()
    assert (fit.rl, fit.rc) == ((), ())
    assert fit.error < 1e-8
    t = np.linspace(0, 50e-6, 2001)

    def step(r: float, inductance: float, c: float) -> NDArray[np.float64]:
        return np.asarray(scipy.signal.step(([inductance * c, r * c, 1], [inductance * c, (r + 1) * c, 1]), T=t)[1])

    assert np.max(np.abs(step(fit.resistance, fit.inductance, fit.capacitance) - step(R, L, C))) < 1e-4


def lossy(f: NDArray[np.float64]) -> Complex:
    """Dielectric loss and skin effect: no finite RLC network has this impedance."""
    w = 2 * np.pi * f
    return np.asarray(R * (1 + np.sqrt(1j * f / 1e7)) + 1j * w * L + 1 / (1j * w * C * (1 - 0.025j)))


@pytest.mark.parametrize(("noise", "rms"), [(0.0, 0.02), (0.02, 0.05), (0.1, 0.2)])
def test_a_fit_is_passive_and_shows_its_error(noise: float, rms: float) -> None:
    generator = np.random.default_rng(7)
    blur = generator.normal(size=len(F)) + 1j * generator.normal(size=len(F))
    z = lossy(F) * (1 + noise * blur)
    fit = MeasuredPart("part.s2p", tuple(F.tolist()), tuple(z.tolist())).fit()
    fine = np.geomspace(1.0, 1e12, 20001)
    assert np.all(fit.impedance(fine).real >= 0)
    assert fit.rms < rms
    assert fit.rms <= fit.error
    worst = np.max(np.abs(fit.impedance(F) / z - 1))
    assert fit.error == pytest.approx(worst, rel=1e-12)
    if noise == 0.1:
        assert np.any(z.real < 0)


def test_what_is_no_passive_part_is_refused_with_the_reason() -> None:
    active = MeasuredPart("part.s1p", tuple(F.tolist()), tuple((-np.ones(len(F)) + 0j).tolist()))
    with pytest.raises(QuantityError, match=r"part\.s1p is not passive"):
        active.fit()
    line = 1j * np.tan(2 * np.pi * F / 1e5) + 1e-3
    with pytest.raises(QuantityError, match="no passive network close"):
        MeasuredPart("line.s1p", tuple(F.tolist()), tuple(line.tolist())).fit()


def test_the_elements_of_a_fit_are_its_network() -> None:
    """Each element's impedance by its own definition, added up along the chain of nodes."""
    fit = MeasuredPart("part.s2p", tuple(F.tolist()), tuple(lossy(F).tolist())).fit()
    elements = fit.elements("C1", "A", "B")
    assert len(fit.rl) + len(fit.rc) == len(elements) - 1 > 0
    node, total = "A", np.zeros(len(F), dtype=complex)
    jw = 2j * np.pi * F
    for element in elements:
        if isinstance(element, Capacitor):
            total += element.esr + jw * element.esl + 1 / (1 / element.leakage + jw * element.capacitance)
        else:
            assert isinstance(element, Bead)
            total += element.dcr + 1 / (1 / element.resistance + 1 / (jw * element.inductance))
        assert element.a == node
        node = element.b
    assert node == "B"
    assert np.max(np.abs(total / fit.impedance(F) - 1)) < 1e-12


def resolved(row: dict[str, object], files: dict[str, bytes]) -> CapacitorModel:
    rows = (KnowledgeRow({"refdes": "C*"}, row, Place("parts.toml"), "parts.toml [[part]] 1"),)
    knowledge = Knowledge(rows=rows, files=MappingProxyType(files))
    model = resolve_part(Part("C1", (Pin("1"), Pin("2")), {"VALUE": "4u7"}), knowledge, Conditions())
    assert isinstance(model, CapacitorModel)
    return model


def test_a_part_is_measured_by_its_table(tmp_path: Path) -> None:
    content, _ = written(network(rlc(F), "shunt"), tmp_path)
    row: dict[str, object] = {"touchstone": {"file": "c.s2p", "connection": "shunt"}}
    for path in ("c.s2p", "/boards/logger/c.s2p", "C:\\boards\\c.s2p"):
        model = resolved(row, {path: content})
        assert model.measured is not None
        assert abs(model.measured.impedance(1e6) / rlc(np.array([1e6]))[0] - 1) < 1e-3
        assert model.stated["touchstone"].source == "parts.toml [[part]] 1"
        assert any("c.s2p, 1 kHz to 1 GHz" in line and "rms" in line for line in model.explain(0.0))
        assumed = {assumption.attribute for assumption in model.assumptions}
        assert "measured data" in assumed
        assert not {"esr", "esl", "loss_tangent"} & assumed
        elements = model.measured.fit_elements("C1", "A", "B")
        assert elements is not None
        assert [type(element) for element in elements] == [Capacitor]


@pytest.mark.parametrize(
    ("file", "connection", "content", "message"),
    [
        ("c.s2p", "shunt", b"", "c.s2p"),
        ("c.s2p", "shunt", b"garbage", "c.s2p"),
        ("c.s1p", "shunt", b"# Hz S RI R 50\n1e6 0.5 0\n2e6 0.5 0\n", "1 ports"),
        ("d.s2p", "shunt", b"", "d.s2p is not there"),
        ("c.s1p", "one-port", b"# Hz S RI R 50\n1e6 0.5 0\n", "two usable points"),
        ("c.s1p", "one-port", b"# Hz S RI R 50\n1e6 0.5 nan\n2e6 x 0\n", "c.s1p"),
    ],
)
def test_an_unusable_file_is_a_problem(file: str, connection: str, content: bytes, message: str) -> None:
    model = resolved({"touchstone": {"file": file, "connection": connection}}, {file.replace("d.", "x."): content})
    assert model.measured is None
    assert any(message in problem.message and problem.severity == "error" for problem in model.problems)


def test_data_that_has_no_fit_serves_over_frequency_only() -> None:
    content = b"# Hz S RI R 50\n" + b"".join(b"%de6 -3 0\n" % n for n in range(1, 9))
    model = resolved({"touchstone": {"file": "c.s1p", "connection": "one-port"}}, {"c.s1p": content})
    assert model.measured is not None
    assert model.measured.fit_elements("C1", "A", "B") is None
    assert any("over frequency only" in problem.message for problem in model.problems)
