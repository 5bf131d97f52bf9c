"""Laminar flow in a round pipe, Hagen-Poiseuille: dp = 128 mu L Q / (pi d^4).

Case: d 1.5 mm, L 10 mm, 10 cm3/s, 10 cSt, 850 kg/m3: 6840.91 Pa (computed from the formula), and
the same through the friction factor 64/Re of the library `fluids`.
"""

from math import pi

import pytest

from optimiser.hydraulics.restrictions import port_terms, short_tube_terms

D, L, Q, DENSITY = 1.5e-3, 10e-3, 10e-6, 850.0
VISCOSITY = 10e-6 * DENSITY
AREA = pi * D * D / 4


def test_viscous_part_of_a_port() -> None:
    a, _ = port_terms(AREA, D, L, 0.72, DENSITY, VISCOSITY)
    assert a * Q == pytest.approx(6840.91, abs=0.005)
    assert a == pytest.approx(128 * VISCOSITY * L / (pi * D**4), rel=1e-14)
    assert short_tube_terms(AREA, L, 0.7, DENSITY, VISCOSITY)[0] == pytest.approx(a, rel=1e-14)


def test_same_as_the_library() -> None:
    fluids = pytest.importorskip("fluids")
    speed = Q / AREA
    reynolds = fluids.Reynolds(V=speed, D=D, rho=DENSITY, mu=VISCOSITY)
    friction = fluids.friction.friction_laminar(reynolds)
    loss = friction * L / D * DENSITY * speed**2 / 2
    assert port_terms(AREA, D, L, 0.72, DENSITY, VISCOSITY)[0] * Q == pytest.approx(loss, rel=1e-12)


def test_parallel_ports_of_one_hydraulic_diameter() -> None:
    """Six equal holes pass six times the oil of one."""
    one, _ = port_terms(AREA, D, L, 0.72, DENSITY, VISCOSITY)
    six, _ = port_terms(6 * AREA, D, L, 0.72, DENSITY, VISCOSITY)
    assert six == pytest.approx(one / 6, rel=1e-14)
