"""Thickness tolerances of narrow steel strip (narrower than 125 mm).

EN 10140, *Cold rolled narrow steel strip - Tolerances on dimensions and shape*, and EN 10258 /
ISO 9445-1, *Cold-rolled stainless steel narrow strip - Tolerances on dimensions and shape*; both as
reproduced by strip suppliers. The program uses EN 10140 up to 0.15 mm and EN 10258 above.
"""

import pytest

from optimiser.materials import Tolerance, thickness_tolerance_mm

# EN 10140: up to 0.10 mm, above 0.10 to 0.15 mm; columns normal, fine, precision
EN_10140 = [(0.05, 8, 6, 4), (0.10, 8, 6, 4), (0.11, 10, 8, 5), (0.15, 10, 8, 5)]
# EN 10258: steps above 0.15 mm; the lower end of a step belongs to it
EN_10258 = [
    (0.16, 15, 10, 8),
    (0.19, 15, 10, 8),
    (0.20, 15, 12, 8),
    (0.24, 15, 12, 8),
    (0.25, 17, 12, 9),
    (0.30, 20, 15, 10),
    (0.39, 20, 15, 10),
]


@pytest.mark.parametrize(("thickness_mm", "normal", "fine", "precision"), EN_10140 + EN_10258)
def test_tables(thickness_mm: float, normal: int, fine: int, precision: int) -> None:
    assert thickness_tolerance_mm(thickness_mm, "normal") == pytest.approx(normal / 1000)
    assert thickness_tolerance_mm(thickness_mm, "fine") == pytest.approx(fine / 1000)
    assert thickness_tolerance_mm(thickness_mm, "precision") == pytest.approx(precision / 1000)


def test_what_it_means_for_the_stiffness_of_a_shim() -> None:
    """Stiffness goes with the cube of thickness; a 0.20 mm shim, printed in whole per cent."""
    printed = {"normal": (-21, 24), "fine": (-17, 19), "precision": (-12, 13)}
    classes: tuple[Tolerance, ...] = ("normal", "fine", "precision")
    for tolerance_class in classes:
        off = thickness_tolerance_mm(0.20, tolerance_class) / 0.20
        softer, stiffer = 100 * ((1 - off) ** 3 - 1), 100 * ((1 + off) ** 3 - 1)
        # the source rounds 12.49 up to 13
        assert (softer, stiffer) == pytest.approx(printed[tolerance_class], abs=0.52)
