"""
The Leipzig wind profile, x along the geostrophic wind and y to its left.

Lettau, H., 1950: A re-examination of the "Leipzig wind profile" considering some relations between
wind and turbulence in the frictional layer. Tellus, 2, 125-129. As transcribed, scaled, in a public
script; scaling back gives all 38 numbers to two decimals exactly (second-hand). Set-up, also
second-hand: geostrophic wind 17.5 m/s, f = 1.13e-4 s-1 (51.3 N), roughness length 0.3 m.
"""

from __future__ import annotations

import numpy as np

_ROWS = """
    50 9.15 4.35   100 10.45 4.64  150 11.58 4.80  200 12.60 4.95  250 13.48 4.96  300 14.30 4.90
    350 14.97 4.78 400 15.62 4.60  450 16.28 4.29  500 16.83 4.00  550 17.30 3.71  600 17.70 3.37
    650 17.99 3.07 700 18.23 2.73  750 18.42 2.43  800 18.60 2.06  850 18.66 1.70  900 18.68 1.31
    950 18.62 0.91
"""
Z, U, V = np.array(_ROWS.split(), dtype=float).reshape(-1, 3).T
