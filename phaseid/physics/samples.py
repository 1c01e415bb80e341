"""Samples to shoot electrons at: where each material is, and how far it is to the next one.

Depth z is positive into the sample, the surface is z = 0. All lengths are in um.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.physics.scattering import Floats32, Material

Regions = NDArray[np.int32]


class Sample(Protocol):
    """What the simulation needs to know of a sample."""

    @property
    def materials(self) -> tuple[Material, ...]:
        """Materials by region number."""

    @property
    def floor_um(self) -> float:
        """Depth below which electrons are lost (inf: none)."""

    def regions(self, x: Floats32, y: Floats32, z: Floats32) -> Regions:
        """Region number at each point."""

    def to_boundary(
        self, x: Floats32, y: Floats32, z: Floats32, ux: Floats32, uy: Floats32, uz: Floats32
    ) -> Floats32:
        """Distance along the direction to the next boundary between regions, inf if none."""


@dataclass(frozen=True, eq=False)
class Bulk:
    """One material filling the half-space."""

    material: Material

    @property
    def materials(self) -> tuple[Material, ...]:
        return (self.material,)

    @property
    def floor_um(self) -> float:
        return np.inf

    def regions(self, x: Floats32, y: Floats32, z: Floats32) -> Regions:
        return np.zeros(len(x), dtype=np.int32)

    def to_boundary(
        self, x: Floats32, y: Floats32, z: Floats32, ux: Floats32, uy: Floats32, uz: Floats32
    ) -> Floats32:
        return np.full(len(x), np.inf, dtype=np.float32)


@dataclass(frozen=True, eq=False)
class Film:
    """A film of even thickness, on a substrate or (None) unsupported."""

    layer: Material
    thickness_um: float
    substrate: Material | None

    def __post_init__(self) -> None:
        _check_length("film thickness", self.thickness_um)

    @property
    def materials(self) -> tuple[Material, ...]:
        return (self.layer,) if self.substrate is None else (self.layer, self.substrate)

    @property
    def floor_um(self) -> float:
        return self.thickness_um if self.substrate is None else np.inf

    def regions(self, x: Floats32, y: Floats32, z: Floats32) -> Regions:
        inside: Regions = (z > self.thickness_um).astype(np.int32)
        return inside if self.substrate is not None else np.zeros_like(inside)

    def to_boundary(
        self, x: Floats32, y: Floats32, z: Floats32, ux: Floats32, uy: Floats32, uz: Floats32
    ) -> Floats32:
        if self.substrate is None:
            return np.full(len(x), np.inf, dtype=np.float32)
        return _to_plane(z, uz, self.thickness_um)


@dataclass(frozen=True, eq=False)
class Inclusion:
    """A sphere in a matrix, cut by the surface or below it.

    Parameters
    ----------
    feature, matrix : Material
    radius_um : float
    centre_depth_um : float
        0: half a sphere, cut at its equator; `radius_um`: a sphere that touches the surface.
    """

    feature: Material
    matrix: Material
    radius_um: float
    centre_depth_um: float = 0.0

    def __post_init__(self) -> None:
        _check_length("radius", self.radius_um)
        if not self.centre_depth_um > -self.radius_um:
            raise InputError(
                f"A sphere of radius {self.radius_um:g} um centred {-self.centre_depth_um:g} um "
                "above the surface is not in the sample; lower its centre."
            )

    @property
    def materials(self) -> tuple[Material, ...]:
        return (self.feature, self.matrix)

    @property
    def floor_um(self) -> float:
        return np.inf

    def regions(self, x: Floats32, y: Floats32, z: Floats32) -> Regions:
        squared = x * x + y * y + (z - np.float32(self.centre_depth_um)) ** 2
        outside: Regions = (squared > np.float32(self.radius_um**2)).astype(np.int32)
        return outside

    def to_boundary(
        self, x: Floats32, y: Floats32, z: Floats32, ux: Floats32, uy: Floats32, uz: Floats32
    ) -> Floats32:
        depth = z - np.float32(self.centre_depth_um)
        along = x * ux + y * uy + depth * uz
        excess = x * x + y * y + depth * depth - np.float32(self.radius_um**2)
        discriminant = along * along - excess
        root = np.sqrt(np.maximum(discriminant, 0))
        # Inside (excess < 0) the far crossing counts; outside the near one, if it lies ahead.
        distance = np.where(excess < 0, root - along, -along - root)
        missed = (discriminant <= 0) | (distance <= 0)
        result: Floats32 = np.where(missed, np.float32(np.inf), distance)
        return result


@dataclass(frozen=True, eq=False)
class Interface:
    """Two half-spaces that meet in the plane x = 0: `left` at x < 0, `right` at x > 0."""

    left: Material
    right: Material

    @property
    def materials(self) -> tuple[Material, ...]:
        return (self.left, self.right)

    @property
    def floor_um(self) -> float:
        return np.inf

    def regions(self, x: Floats32, y: Floats32, z: Floats32) -> Regions:
        right: Regions = (x > 0).astype(np.int32)
        return right

    def to_boundary(
        self, x: Floats32, y: Floats32, z: Floats32, ux: Floats32, uy: Floats32, uz: Floats32
    ) -> Floats32:
        return _to_plane(x, ux, 0.0)


def _to_plane(position: Floats32, direction: Floats32, plane: float) -> Floats32:
    with np.errstate(divide="ignore", invalid="ignore"):
        distance = (np.float32(plane) - position) / direction
    result: Floats32 = np.where(distance > 0, distance, np.float32(np.inf))
    return result


def _check_length(what: str, value: float) -> None:
    if not 0 < value < np.inf:
        raise InputError(f"A {what} of {value:g} um cannot be used; give a value above 0.")
