"""Polar measurements as Cartesian ones, without the bias of the plain conversion."""

from __future__ import annotations

import numpy as np

from tracker.log.model import Floats


def debiased(
    reach: Floats, azimuth: Floats, sigma_range: float, sigma_azimuth: float
) -> tuple[Floats, Floats]:
    """Debiased consistent converted measurements.

    Parameters
    ----------
    reach : (n,) measured range.   azimuth : (n,) measured azimuth, radians from x towards y.
    sigma_range, sigma_azimuth : their standard deviations, in the same units.

    Returns
    -------
    (n, 2) x and y, with the average bias x (exp(-s²) - exp(-s²/2)) subtracted, and (n, 3)
    covariances xx, yy, xy; s is `sigma_azimuth`.

    Source: Lerro and Bar-Shalom 1993, "Tracking with debiased consistent converted measurements
    versus EKF", IEEE Trans. AES 29(3), eqs. for mu_a and R_a (from memory, checked by simulation).
    """
    s2 = sigma_azimuth**2
    cos, sin = np.cos(azimuth), np.sin(azimuth)
    factor = 1.0 - (np.exp(-s2) - np.exp(-0.5 * s2))
    r2, sr2 = reach**2, sigma_range**2
    near, far = np.cosh(s2), np.cosh(2.0 * s2)
    near_s, far_s = np.sinh(s2), np.sinh(2.0 * s2)
    fade = np.exp(-2.0 * s2)
    # Radial and tangential parts of the covariance; turned by the azimuth below.
    radial = r2 * (far - near) + sr2 * (2.0 * far - near)
    across = r2 * (far_s - near_s) + sr2 * (2.0 * far_s - near_s)
    xx = fade * (cos**2 * radial + sin**2 * across)
    yy = fade * (sin**2 * radial + cos**2 * across)
    xy = sin * cos * np.exp(-4.0 * s2) * (sr2 + (r2 + sr2) * (1.0 - np.exp(s2)))
    xy_position = factor * np.stack((reach * cos, reach * sin), axis=1)
    return xy_position, np.stack((xx, yy, xy), axis=1)
