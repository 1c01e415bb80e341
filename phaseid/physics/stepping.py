"""The inner loop: a block of electrons, one flight and one collision at a time, all abreast."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from phaseid.physics.samples import Sample
from phaseid.physics.scattering import NODES, Floats32, Tables

_F = np.float32
_TWO_PI = _F(2 * np.pi)


@dataclass(frozen=True)
class Start:
    """How the electrons arrive.

    Attributes
    ----------
    energy_keV : float
    tilt_deg : float
        The beam comes in the x-z plane, leaning towards +x.
    position_um : tuple of float
        Point of impact (x, y).
    diameter_um : float
        Diameter of an evenly filled beam.
    """

    energy_keV: float
    tilt_deg: float = 0.0
    position_um: tuple[float, float] = (0.0, 0.0)
    diameter_um: float = 0.0


EXIT_COLUMNS = ("energy_keV", "ux", "uy", "uz", "x_um", "y_um", "depth_um")


def run_block(
    sample: Sample,
    tables: Tables,
    start: Start,
    cutoff_keV: float,
    electrons: int,
    rng: np.random.Generator,
) -> Floats32:
    """Follow `electrons` electrons until each has left or can no longer leave.

    Parameters
    ----------
    sample : Sample
    tables : Tables
        Of the sample's materials.
    start : Start
    cutoff_keV : float
    electrons : int
    rng : Generator

    Returns
    -------
    ndarray of float32, shape (7, backscattered)
        Rows `EXIT_COLUMNS`: energy, direction of flight (uz < 0), point of exit, greatest depth.

    Notes
    -----
    An electron whose remaining path is shorter than its depth is given up: it cannot come back, so
    this saves most of the work and changes nothing. Between collisions a boundary stops the flight
    and a new free path is drawn in the next material, as free paths have no memory.
    """
    x, y, z, ux, uy, uz, energy = _launch(start, electrons, rng)
    deepest = np.zeros(electrons, dtype=_F)
    several = len(sample.materials) > 1
    region = sample.regions(x, y, z) if several else None
    floor, cutoff = _F(sample.floor_um), _F(cutoff_keV)
    per_root = _F(tables.per_root)
    found: list[Floats32] = []

    while len(x):
        node = np.sqrt(energy)
        node *= per_root
        index: NDArray[np.intp] = np.minimum(node.astype(np.intp), NODES - 1)
        at = index if region is None else index + region.astype(np.intp) * NODES
        flight: Floats32 = np.log(1 - rng.random(len(x), dtype=_F))
        flight *= -tables.mean_free_path[at]
        crossing: NDArray[np.bool_] | None = None
        if several:
            to_boundary = sample.to_boundary(x, y, z, ux, uy, uz)
            crossing = to_boundary < flight
            # A hair beyond the boundary, so that rounding cannot leave it on the old side.
            np.minimum(flight, to_boundary * _F(1.00001) + _F(1e-6), out=flight)
        loss = tables.stopping[at]

        depth = z + uz * flight
        out = depth < 0
        leaving = np.flatnonzero(out & (energy > 0))
        if len(leaving):
            way = flight[leaving] * (z[leaving] / (z[leaving] - depth[leaving]))
            left_with = energy[leaving] - way * loss[leaving]
            rows = [left_with, ux[leaving], uy[leaving], uz[leaving]]
            rows += [x[leaving] + ux[leaving] * way, y[leaving] + uy[leaving] * way]
            rows.append(deepest[leaving])
            found.append(np.stack(rows)[:, left_with > cutoff])

        x += ux * flight
        y += uy * flight
        z = depth
        energy -= flight * loss
        np.maximum(deepest, z, out=deepest)
        lost = out | (energy < cutoff) | (z > tables.reach[index]) | (z > floor)
        count = int(np.count_nonzero(lost))
        if count * 16 > len(x):
            kept = np.flatnonzero(~lost)
            x, y, z, ux, uy, uz, energy, deepest = (
                values[kept] for values in (x, y, z, ux, uy, uz, energy, deepest)
            )
            at = at[kept]
            crossing = None if crossing is None else crossing[kept]
        elif count:
            # Repacking costs more than carrying a few along; without energy they do nothing.
            energy[lost] = 0
        region = sample.regions(x, y, z) if several else None
        cosine = _deflection(tables, at, rng)
        if crossing is not None:
            cosine[crossing] = 1
        ux, uy, uz = _turned(ux, uy, uz, cosine, rng)
    if not found:
        return np.zeros((len(EXIT_COLUMNS), 0), dtype=_F)
    return np.concatenate(found, axis=1)


def _launch(start: Start, electrons: int, rng: np.random.Generator) -> tuple[Floats32, ...]:
    """Positions, directions and energies at the surface."""
    x = np.full(electrons, start.position_um[0], dtype=_F)
    y = np.full(electrons, start.position_um[1], dtype=_F)
    if start.diameter_um > 0:
        radius = _F(start.diameter_um / 2) * np.sqrt(rng.random(electrons, dtype=_F))
        azimuth = _TWO_PI * rng.random(electrons, dtype=_F)
        x += radius * np.cos(azimuth)
        y += radius * np.sin(azimuth)
    tilt = np.radians(start.tilt_deg)
    ux = np.full(electrons, np.sin(tilt), dtype=_F)
    uz = np.full(electrons, np.cos(tilt), dtype=_F)
    energy = np.full(electrons, start.energy_keV, dtype=_F)
    zeros = np.zeros(electrons, dtype=_F)
    return x, y, zeros, ux, zeros.copy(), uz, energy


def _deflection(tables: Tables, at: NDArray[np.intp], rng: np.random.Generator) -> Floats32:
    """Cosine of the scattering angle.

    ``1 - 2 alpha R / (1 + alpha - R)``, written with q = 1/alpha so that q = 0 is isotropic.
    """
    draw, share = rng.random((2, len(at)), dtype=_F)
    peak = tables.channel_peak[0][at]
    for limit, next_peak in zip(tables.channel_limit, tables.channel_peak[1:], strict=True):
        peak = np.where(draw < limit[at], peak, next_peak[at])
    peak *= 1 - share
    peak += 1
    cosine: Floats32 = 1 - 2 * share / peak
    return cosine


def _turned(
    ux: Floats32, uy: Floats32, uz: Floats32, cosine: Floats32, rng: np.random.Generator
) -> tuple[Floats32, Floats32, Floats32]:
    """Turn each direction by its angle about a random azimuth.

    The two perpendicular directions are those of Duff et al. 2017, Journal of Computer Graphics
    Techniques 6(1), which stay exact near the poles.
    """
    sine = np.sqrt(np.maximum(1 - cosine * cosine, 0))
    azimuth = _TWO_PI * rng.random(len(ux), dtype=_F)
    along = sine * np.cos(azimuth)
    across = sine * np.sin(azimuth)
    sign = np.copysign(_F(1), uz)
    a = -1 / (sign + uz)
    b = ux * uy * a
    new_x = cosine * ux + along * (1 + sign * ux * ux * a) + across * b
    new_y = cosine * uy + along * (sign * b) + across * (sign + uy * uy * a)
    new_z = cosine * uz - along * (sign * ux) - across * uy
    # Single precision drifts off unit length over hundreds of collisions.
    scale = _F(1.5) - _F(0.5) * (new_x * new_x + new_y * new_y + new_z * new_z)
    return new_x * scale, new_y * scale, new_z * scale
