"""Coefficients of IAPWS-IF97 for liquid water and for saturation, as its release prints them.

IAPWS R7-97(2012), Revised Release on the IAPWS Industrial Formulation 1997
for the Thermodynamic Properties of Water and Steam: table 2 (region 1) and
table 34 (region 4). A wrong digit shows in the release's own verification
values, against which the tests hold these.
"""

from __future__ import annotations

from typing import Final

GAS_CONSTANT_J_PER_KGK: Final = 461.526
"""Specific gas constant of ordinary water in this formulation, equation (1)."""

REGION_1_PRESSURE_PA: Final = 16.53e6
REGION_1_TEMPERATURE_K: Final = 1386.0
"""Scales of region 1, section 5.1: pi = p / 16.53 MPa, tau = 1386 K / T."""

CRITICAL_TEMPERATURE_K: Final = 647.096
"""Equation (2)."""

REGION_1: Final[tuple[tuple[int, int, float], ...]] = (
    (0, -2, 0.14632971213167),
    (0, -1, -0.84548187169114),
    (0, 0, -0.37563603672040e1),
    (0, 1, 0.33855169168385e1),
    (0, 2, -0.95791963387872),
    (0, 3, 0.15772038513228),
    (0, 4, -0.16616417199501e-1),
    (0, 5, 0.81214629983568e-3),
    (1, -9, 0.28319080123804e-3),
    (1, -7, -0.60706301565874e-3),
    (1, -1, -0.18990068218419e-1),
    (1, 0, -0.32529748770505e-1),
    (1, 1, -0.21841717175414e-1),
    (1, 3, -0.52838357969930e-4),
    (2, -3, -0.47184321073267e-3),
    (2, 0, -0.30001780793026e-3),
    (2, 1, 0.47661393906987e-4),
    (2, 3, -0.44141845330846e-5),
    (2, 17, -0.72694996297594e-15),
    (3, -4, -0.31679644845054e-4),
    (3, 0, -0.28270797985312e-5),
    (3, 6, -0.85205128120103e-9),
    (4, -5, -0.22425281908000e-5),
    (4, -2, -0.65171222895601e-6),
    (4, 10, -0.14341729937924e-12),
    (5, -8, -0.40516996860117e-6),
    (8, -11, -0.12734301741641e-8),
    (8, -6, -0.17424871230634e-9),
    (21, -29, -0.68762131295531e-18),
    (23, -31, 0.14478307828521e-19),
    (29, -38, 0.26335781662795e-22),
    (30, -39, -0.11947622640071e-22),
    (31, -40, 0.18228094581404e-23),
    (32, -41, -0.93537087292458e-25),
)
"""Table 2: exponents I and J and coefficient n of ``n (7.1 - pi)**I (tau - 1.222)**J``."""

REGION_4: Final[tuple[float, ...]] = (
    0.11670521452767e4,
    -0.72421316703206e6,
    -0.17073846940092e2,
    0.12020824702470e5,
    -0.32325550322333e7,
    0.14915108613530e2,
    -0.48232657361591e4,
    0.40511340542057e6,
    -0.23855557567849,
    0.65017534844798e3,
)
"""Table 34: n1 to n10 of the saturation-pressure equation."""
