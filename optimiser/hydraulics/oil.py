"""The damper's oil: viscosity and density at any temperature.

Viscosity follows ASTM D341 (Walther's equation) through two measured points, density the volume
correction for lubricating oils of ASTM D1250. Both describe the oil at atmospheric pressure; the
rise of viscosity with pressure and dissolved gas are left out.
"""

from math import exp, log10
from typing import NamedTuple, Protocol

from optimiser.faults import BadInput

ZERO_CELSIUS_K = 273.15
#: ASTM D1250, lubricating oils: alpha15 = K1 / rho15 (K0 = 0), kg/m3 per kelvin. From memory.
LUBRICATING_K1 = 0.6278
COLDEST_C, HOTTEST_C = -40.0, 200.0


class OilRecord(Protocol):
    """What must be known of an oil: viscosity cSt (mm2/s), density kg/m3, pressure MPa absolute."""

    @property
    def viscosity_40c_cst(self) -> float: ...
    @property
    def viscosity_100c_cst(self) -> float: ...
    @property
    def density_15c_kg_m3(self) -> float: ...
    @property
    def vapour_pressure_mpa(self) -> float: ...


class OilState(NamedTuple):
    """The oil at one temperature, SI: density kg/m3, dynamic viscosity Pa s, vapour pressure Pa."""

    density_kg_m3: float
    viscosity_pa_s: float
    vapour_pressure_pa: float


def oil_at(oil: OilRecord, temp_c: float) -> OilState:
    """State of ``oil`` at ``temp_c`` (degrees Celsius).

    Dynamic viscosity = kinematic viscosity (ASTM D341) x density (ASTM D1250). The vapour pressure
    is taken as it stands in the record, absolute. Raises BadInput for a temperature outside
    -40 to 200 degrees C or a record that no oil can have.
    """
    faults = _faults_of(oil)
    if not COLDEST_C <= temp_c <= HOTTEST_C:
        faults.append(f"oil temperature {temp_c:g} C: allowed is {COLDEST_C:g} to {HOTTEST_C:g} C")
    if faults:
        raise BadInput(faults)
    density = density_kg_m3(oil.density_15c_kg_m3, temp_c)
    kinematic = viscosity_cst(oil.viscosity_40c_cst, oil.viscosity_100c_cst, temp_c)
    return OilState(density, kinematic * 1e-6 * density, oil.vapour_pressure_mpa * 1e6)


def viscosity_cst(viscosity_40c_cst: float, viscosity_100c_cst: float, temp_c: float) -> float:
    """Kinematic viscosity (cSt) at ``temp_c`` (C) from the values (cSt) at 40 and 100 C.

    ASTM D341: log10 log10 Z = A - B log10 T, T in kelvin, Z = nu + 0.7 plus a term that only
    matters below 2 cSt (see :func:`_walther`).
    """
    warm, hot, here = (log10(t + ZERO_CELSIUS_K) for t in (40.0, 100.0, temp_c))
    at_warm, at_hot = (log10(log10(_walther(v))) for v in (viscosity_40c_cst, viscosity_100c_cst))
    exponent = at_warm + (at_hot - at_warm) * (here - warm) / (hot - warm)
    return _kinematic(10.0 ** (10.0**exponent))


def density_kg_m3(density_15c_kg_m3: float, temp_c: float) -> float:
    """Density (kg/m3) at ``temp_c`` (C) from the density (kg/m3) at 15 C.

    ASTM D1250 for lubricating oils: rho = rho15 exp(-alpha dT (1 + 0.8 alpha dT)), alpha =
    0.6278 / rho15, dT = temp_c - 15. The constant is from memory.
    """
    expansion = LUBRICATING_K1 / density_15c_kg_m3 * (temp_c - 15.0)
    return density_15c_kg_m3 * exp(-expansion * (1.0 + 0.8 * expansion))


def _walther(nu: float) -> float:
    """Z(nu) of ASTM D341, valid down to 0.21 cSt; the exponential term is from memory."""
    return nu + 0.7 + exp(-1.47 - 1.84 * nu - 0.51 * nu * nu)


def _kinematic(z: float) -> float:
    """nu(Z) of ASTM D341, the printed approximate inverse of :func:`_walther`, from memory."""
    x = z - 0.7
    return x - exp(-0.7487 - 3.295 * x + 0.6119 * x * x - 0.3193 * x**3)


def _faults_of(oil: OilRecord) -> list[str]:
    faults = []
    if not 0.5 <= oil.viscosity_100c_cst < oil.viscosity_40c_cst <= 2000.0:
        faults.append(
            f"oil viscosity {oil.viscosity_40c_cst:g} cSt at 40 C and {oil.viscosity_100c_cst:g} "
            "cSt at 100 C: allowed is 0.5 to 2000 cSt, the hot one smaller than the cold one"
        )
    if not 500.0 <= oil.density_15c_kg_m3 <= 1500.0:
        faults.append(
            f"oil density {oil.density_15c_kg_m3:g} kg/m3 at 15 C: must be 500 to 1500 kg/m3"
        )
    if not 0.0 <= oil.vapour_pressure_mpa <= 0.5:
        faults.append(
            f"oil vapour pressure {oil.vapour_pressure_mpa:g} MPa: must be 0 to 0.5 MPa absolute"
        )
    return faults
