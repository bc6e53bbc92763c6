"""The fit against certified values of NIST StRD nonlinear regression.

b2 = 1/tau; the standard error of tau is that of b2 over b2^2 (delta rule).
"""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from tausheet.functions import fit_from

REFERENCES = Path(__file__).parent / "references"


def agree(ours: float, certified: float, digits: int) -> bool:
    return abs(ours / certified - 1) < 0.5 * 10.0 ** (1 - digits)


def test_misra1a_to_nine_digits_and_six() -> None:
    path = REFERENCES / "nist-strd-misra1a.dat"
    lines = path.read_text().splitlines()
    (b1, b1_sd), (b2, b2_sd) = (
        map(float, re.findall(r"[0-9.]+E[-+][0-9]+", line)) for line in lines[40:42]
    )
    residual = float(re.findall(r"[0-9.]+E[-+][0-9]+", lines[44])[0])
    volume, pressure = np.loadtxt(path, skiprows=60, unpack=True)
    assert volume.size == 14
    result = fit_from(pressure, volume, 0.0, 0.0)
    assert agree(result.final, b1, 9)
    assert agree(result.tau, 1 / b2, 9)
    assert agree(result.residual, residual, 9)
    assert agree(result.final_error, b1_sd, 6)
    assert agree(result.tau_error, b2_sd / b2**2, 6)


def test_boxbod_without_its_starting_values() -> None:
    rows = [
        line.split(":") for line in (REFERENCES / "nist-strd-boxbod.txt").read_text().splitlines()
        if not line.startswith("#")
    ]  # fmt: skip
    certified = {name: [float(v) for v in text.split()] for name, text in rows if name != "point"}
    points = np.array([text.split() for name, text in rows if name == "point"], dtype=float)
    result = fit_from(points[:, 1], points[:, 0], 0.0, 0.0)
    (b1, b1_sd), (b2, b2_sd) = certified["b1"], certified["b2"]
    assert agree(result.final, b1, 9)
    assert agree(result.tau, 1 / b2, 9)
    assert agree(result.residual, certified["residual"][0], 9)
    assert agree(result.final_error, b1_sd, 6)
    assert agree(result.tau_error, b2_sd / b2**2, 6)


@pytest.mark.parametrize("order", [[5, 3, 1, 0, 2, 4], [1, 0, 3, 2, 5, 4]])
def test_the_order_of_the_points_does_not_matter(order: list[int]) -> None:
    x, y = np.array([1.0, 2, 3, 5, 7, 10]), np.array([109.0, 149, 149, 191, 213, 224])
    in_order = fit_from(x, y, 0.0, 0.0)
    np.testing.assert_allclose(fit_from(x[order], y[order], 0.0, 0.0), in_order, rtol=1e-12)
