"""Loss of capacitance under bias against Johnson's law, published points, and independent integration."""

from __future__ import annotations

from itertools import pairwise

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.design import Part, Pin
from reactance.analysis.parts.band import Band
from reactance.analysis.parts.bias import BiasCurve, HalfVoltage, estimated_half_voltage, johnson, johnson_integral
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.models import CapacitorModel, Conditions
from reactance.analysis.parts.resolve import resolve_part


def test_half_voltage_halves() -> None:
    """Johnson, J. Appl. Phys. 33 (1962) 2826, scaled so that k(V_half) = 1/2."""
    assert float(johnson(7.0, 7.0)) == pytest.approx(0.5, rel=1e-15)
    assert float(johnson(0.0, 7.0)) == 1.0


@pytest.mark.parametrize(
    ("texts", "volts", "kept"),
    [
        # Distributor and maker notes on DC bias of class II ceramics.
        (("10uF", "10V", "X7R", "0805"), 5.0, 0.50),
        (("10uF", "10V", "X7R", "1206"), 5.0, 0.93),
        (("22uF", "35V", "X5R", "1210"), 25.0, 0.20),
    ],
)
def test_the_estimate_contains_published_points(texts: tuple[str, ...], volts: float, kept: float) -> None:
    attributes = dict(zip(("VALUE", "VOLTAGE", "DIELECTRIC", "PACKAGE"), texts, strict=True))
    model = resolve_part(Part("C1", (Pin("1"), Pin("2")), attributes), Knowledge(), Conditions())
    assert isinstance(model, CapacitorModel)
    factor = model.bias_factor(volts)
    assert factor.low <= kept <= factor.high
    assert factor.low < factor.nominal < factor.high
    assert model.needs_curve
    assert any("a bias curve would narrow" in line for line in model.explain(volts))


def test_geometry_by_hand() -> None:
    """d = sqrt(eps0 epsr phi volume / C), V_half = 4 V/um d: 10 uF in 0805 worked with mpmath."""
    with mpmath.workdps(30):
        volume = mpmath.mpf("2.0e-3") * mpmath.mpf("1.25e-3") ** 2
        thickness = mpmath.sqrt(
            mpmath.mpf("8.8541878128e-12") * 3000 * mpmath.mpf("0.5") * volume / mpmath.mpf("10e-6")
        )
        wanted = float(4 * thickness * 1000000)
    assert estimated_half_voltage(10e-6, 2.0e-3 * 1.25e-3**2).nominal == pytest.approx(wanted, rel=1e-12)


@pytest.mark.parametrize("u", [1e-6, 0.01, 0.3, 0.378, 0.5, 1.0, 3.0, 10.0, 100.0, 1e4])
def test_charge_of_the_law_against_quadrature(u: float) -> None:
    with mpmath.workdps(30):
        law = mpmath.quad(lambda v: (1 + 7 * v * v) ** (-mpmath.mpf(1) / 3), mpmath.linspace(0, u, 20))
    assert float(johnson_integral(u * 8.0, 8.0)) == pytest.approx(8.0 * float(law), rel=1e-13)
    assert float(johnson_integral(-u * 8.0, 8.0)) == -float(johnson_integral(u * 8.0, 8.0))


CURVE = BiasCurve(((0.0, 1.0), (2.0, 0.9), (5.0, 0.62), (10.0, 0.35)))


def test_curve_goes_through_its_points_and_stays_monotone() -> None:
    for at, factor in CURVE.points:
        assert CURVE.factor(at) == Band.exact(factor)
        assert CURVE.factor(-at) == Band.exact(factor)
    values = CURVE.nominal(np.linspace(0, 12, 1201))
    assert np.all(np.diff(values) <= 0)


def test_curve_is_clamped_and_says_so() -> None:
    assert CURVE.factor(50.0).nominal == 0.35
    assert not CURVE.beyond(10.0)
    assert CURVE.beyond(10.1)
    assert "ends at 10 V" in CURVE.describe(12.0)
    assert CURVE.describe(5.0) == "stated curve"


def fritsch_carlson(x: list[float], y: list[float], at: mpmath.mpf) -> mpmath.mpf:
    """Monotone cubic worked from the published formulas: harmonic slopes inside, three-point ends."""
    h = [mpmath.mpf(b) - mpmath.mpf(a) for a, b in pairwise(x)]
    d = [(mpmath.mpf(b) - mpmath.mpf(a)) / s for (a, b), s in zip(pairwise(y), h, strict=True)]
    slopes = [((2 * h[0] + h[1]) * d[0] - h[0] * d[1]) / (h[0] + h[1])]
    for k in range(1, len(h)):
        w1, w2 = 2 * h[k] + h[k - 1], h[k] + 2 * h[k - 1]
        slopes.append((w1 + w2) / (w1 / d[k - 1] + w2 / d[k]))
    slopes.append(((2 * h[-1] + h[-2]) * d[-1] - h[-1] * d[-2]) / (h[-1] + h[-2]))
    k = next(k for k in range(len(h)) if at <= x[k + 1])
    t = (at - x[k]) / h[k]
    left = (1 + 2 * t) * (1 - t) ** 2 * mpmath.mpf(y[k]) + t * (1 - t) ** 2 * h[k] * slopes[k]
    return left + t * t * (3 - 2 * t) * mpmath.mpf(y[k + 1]) + t * t * (t - 1) * h[k] * slopes[k + 1]


@pytest.mark.parametrize("volts", [0.5, 2.0, 3.7, 9.9])
def test_curve_and_its_charge_against_published_formulas(volts: float) -> None:
    """Fritsch and Carlson, SIAM J. Numer. Anal. 17 (1980) 238; slopes of Fritsch and Butland (1984)."""
    x, y = [0.0, 2.0, 5.0, 10.0], [1.0, 0.9, 0.62, 0.35]
    knots = [knot for knot in x if knot < volts] + [volts]
    with mpmath.workdps(30):
        area = mpmath.quad(lambda v: fritsch_carlson(x, y, v), knots)
        value = fritsch_carlson(x, y, mpmath.mpf(volts))
    assert float(CURVE.nominal(volts)) == pytest.approx(float(value), rel=1e-13)
    assert float(CURVE.integral(volts)) == pytest.approx(float(area), rel=1e-13)
    assert float(CURVE.integral(-volts)) == -float(CURVE.integral(volts))


def test_charge_beyond_the_curve_and_before_it() -> None:
    late = BiasCurve(((2.0, 0.8), (4.0, 0.5)))
    assert float(late.integral(1.0)) == pytest.approx(0.8, rel=1e-15)
    assert float(late.integral(6.0)) - float(late.integral(4.0)) == pytest.approx(1.0, rel=1e-13)
    one = BiasCurve(((3.0, 0.7),))
    assert float(one.integral(-10.0)) == pytest.approx(-7.0, rel=1e-15)
    assert one.nominal(np.array([0.0, 5.0])).tolist() == [0.7, 0.7]


@given(st.floats(min_value=-100, max_value=100), st.floats(min_value=0.5, max_value=50))
def test_the_charge_is_the_integral_of_the_capacitance(volts: float, half: float) -> None:
    for law in (HalfVoltage(Band.exact(half)), CURVE):
        step = 1e-4
        slope = float(law.integral(volts + step) - law.integral(volts - step)) / (2 * step)
        assert slope == pytest.approx(float(law.nominal(volts)), rel=1e-4)
