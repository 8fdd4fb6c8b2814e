"""Self-energy of the test functions: integral of psi(x) psi(y) / |x - y| over one panel.

Tabulated for P1 and P2 across a rectangle, divided by area times shorter side, against the
ratio of the side along the polynomial to the other (48 strips, closed integrals: the tests
recompute it). Other panels take the rectangle of their mean sides. The indicator needs a
few per cent, and that is what this gives.
"""

from __future__ import annotations

import numpy as np

from bem.kernels.arrays import PanelArrays
from bem.kernels.targets import Targets

LOG2_RATIO = np.arange(-7.0, 8.0)
P1_ENERGY = np.array(
    [0.49867, 0.49764, 0.49557, 0.49149, 0.48349, 0.46813, 0.43991, 0.39249,
     0.64896, 0.98259, 1.37175, 1.79478, 2.23656, 2.68823, 3.14496]
)  # fmt: skip
P2_ENERGY = np.array(
    [0.16608, 0.16594, 0.16564, 0.16505, 0.16386, 0.16149, 0.15676, 0.14755,
     0.26224, 0.42834, 0.63815, 0.87767, 1.13469, 1.40125, 1.67278]
)  # fmt: skip
_GROWTH = 2.0 * np.log(2.0)


def _table(log_ratio: np.ndarray, values: np.ndarray, square: float) -> np.ndarray:
    """Interpolated; beyond the last ratio it grows as 2 log(ratio) times the mean square."""
    beyond = np.maximum(log_ratio - LOG2_RATIO[-1], 0.0)
    return np.interp(log_ratio, LOG2_RATIO, values) + beyond * _GROWTH * square


def indicator_energies(panels: PanelArrays, targets: Targets) -> np.ndarray:
    """(n, 4) self-energies of the four tests of each panel."""
    side = panels.sides[:, :, 2]
    u, v = 0.5 * (side[:, 0] + side[:, 2]), 0.5 * (side[:, 1] + side[:, 3])
    log_ratio = np.log2(u / v)
    unit = panels.area * np.minimum(u, v)
    square = targets.square / panels.area[:, None]
    return np.stack(
        [
            _table(log_ratio, P1_ENERGY, 1 / 3) * unit * square[:, 0] * 3.0,
            _table(-log_ratio, P1_ENERGY, 1 / 3) * unit * square[:, 1] * 3.0,
            _table(log_ratio, P2_ENERGY, 1 / 5) * unit * square[:, 2] * 5.0,
            _table(-log_ratio, P2_ENERGY, 1 / 5) * unit * square[:, 3] * 5.0,
        ],
        axis=1,
    )
