"""Flat panels that cover closed bodies, as arrays."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Panels:
    """N flat convex panels of three or four corners, counter-clockwise seen from outside.

    Attributes
    ----------
    corners_m : ndarray [N, 4, 3]
        A triangle repeats its last corner.
    patch : ndarray of int [N]
        Which patch (surface) a panel belongs to.
    """

    corners_m: Array
    patch: Index

    @property
    def twice_area_m2(self) -> Array:
        """Twice the areas of the two triangles 0-1-2 and 0-2-3 of every panel [N, 2]."""
        v = self.corners_m
        first = np.cross(v[:, 1] - v[:, 0], v[:, 2] - v[:, 0])
        second = np.cross(v[:, 2] - v[:, 0], v[:, 3] - v[:, 0])
        return np.stack([np.sqrt((x**2).sum(axis=1)) for x in (first, second)], axis=1)

    @property
    def area_m2(self) -> Array:
        """Areas [N]."""
        return np.asarray(0.5 * self.twice_area_m2.sum(axis=1))

    @property
    def normal(self) -> Array:
        """Outward unit normals [N, 3]."""
        v = self.corners_m
        across = np.cross(v[:, 2] - v[:, 0], v[:, 3] - v[:, 1])
        return np.asarray(across / np.sqrt((across**2).sum(axis=1))[:, None])

    @property
    def centre_m(self) -> Array:
        """Centroids [N, 3]."""
        v, twice = self.corners_m, self.twice_area_m2
        thirds = np.stack([(v[:, 0] + v[:, 1] + v[:, 2]), (v[:, 0] + v[:, 2] + v[:, 3])], axis=1)
        return np.asarray((thirds * twice[..., None]).sum(axis=1) / twice.sum(axis=1)[:, None] / 3)

    @property
    def volume_m3(self) -> float:
        """Volume that closed panels enclose; negative when they point inwards."""
        return float((self.centre_m * self.normal).sum(axis=1) @ self.area_m2 / 3.0)

    def __len__(self) -> int:
        return len(self.patch)


def joined(parts: Sequence[Panels]) -> Panels:
    """All panels of several sets, in order."""
    return Panels(
        np.concatenate([part.corners_m for part in parts]),
        np.concatenate([part.patch for part in parts]),
    )
