"""The trajectories once more, one electron at a time: what the fast form is measured against."""

from __future__ import annotations

import math
import random
from collections.abc import Callable

from phaseid.physics.scattering import LOWEST_KEV, NODES, Material, tabulate

Follow = Callable[..., int]


def follow(  # type: ignore[no-untyped-def]
    electrons, energy_keV, per_root, mean_free_path, stopping, reach, limit, peak, cutoff_keV
):
    """Count the electrons that come back from a bulk; plain enough for numba to compile as it is."""
    back = 0
    for _ in range(electrons):
        z = ux = uy = 0.0
        uz = 1.0
        energy = energy_keV
        while True:
            node = min(int(math.sqrt(energy) * per_root), len(stopping) - 1)
            step = -mean_free_path[node] * math.log(1.0 - random.random())
            new_z = z + uz * step
            if new_z < 0.0:
                if energy - step * z / (z - new_z) * stopping[node] > cutoff_keV:
                    back += 1
                break
            z = new_z
            energy -= step * stopping[node]
            if energy < cutoff_keV or z > reach[node]:
                break
            sharp = peak[node] if random.random() < limit[node] else 0.0
            share = random.random()
            cosine = 1.0 - 2.0 * share / (1.0 + sharp * (1.0 - share))
            sine = math.sqrt(max(1.0 - cosine * cosine, 0.0))
            azimuth = 2.0 * math.pi * random.random()
            along, across = sine * math.cos(azimuth), sine * math.sin(azimuth)
            sign = math.copysign(1.0, uz)
            a = -1.0 / (sign + uz)
            b = ux * uy * a
            ux, uy, uz = (
                cosine * ux + along * (1.0 + sign * ux * ux * a) + across * b,
                cosine * uy + along * sign * b + across * (sign + uy * uy * a),
                cosine * uz - along * sign * ux - across * uy,
            )
            norm = math.sqrt(ux * ux + uy * uy + uz * uz)
            ux, uy, uz = ux / norm, uy / norm, uz / norm
    return back


def arguments(material: Material, energy_keV: float, *, as_lists: bool) -> tuple[object, ...]:
    """What `follow` takes after the number of electrons; lists are faster for the plain loop."""
    tables = tabulate((material,), energy_keV, "browning", LOWEST_KEV)
    arrays = [
        values.astype(float)
        for values in (
            tables.mean_free_path,
            tables.stopping,
            tables.reach,
            tables.channel_limit[0],
            tables.channel_peak[0],
        )
    ]
    assert len(arrays[0]) == NODES
    ready = [values.tolist() for values in arrays] if as_lists else arrays
    return (energy_keV, tables.per_root, *ready, LOWEST_KEV)
