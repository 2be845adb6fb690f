"""What the beam model knows of a section."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class SectionProperties:
    """Properties of one outline, in mm; (y, z) are the outline's own coordinates.

    Second moments are about the centroid: ``Iyy`` = int z^2 dA (bending about y), ``Izz`` = int y^2 dA,
    ``Iyz`` = int y z dA.

    Attributes
    ----------
    area, yc, zc
        Area and centroid.
    Iyy, Izz, Iyz
        Second moments and product of inertia about the centroid, mm^4.
    I1, I2, principal_angle
        Principal second moments (I1 >= I2) and the angle from y to the axis about which I1 is taken, rad.
    ys, zs
        Shear centre (Trefftz definition: torsion and bending energies uncoupled).
    shear_compliance
        (2, 2) symmetric, 1/mm^2, ordered (y, z): shear energy per length = V^T C V / (2 G), from the
        Saint-Venant flexure problem with the material's Poisson's ratio. Shear area along z of a
        symmetric section = 1 / C[1, 1].
    J
        Saint-Venant torsion constant, mm^4.
    Iw
        Warping constant about the shear centre, mm^6.
    open_thin
        True when restrained warping matters: an open outline of thin walls.
    extremes
        (4, 2) the points top, bottom, left, right (see `fem.figure`): highest z (middle of the side
        when it is flat), lowest z, least y (of several flat sides the upper one), greatest y.
    W_top, W_bottom, W_left, W_right
        Elastic moduli Iyy / |z - zc| and Izz / |y - yc| at those points, mm^3.
    torsion_stress
        Largest Saint-Venant shear stress for a unit torque, 1/mm^3.
    warping
        (4,) warping function about the shear centre (zero mean) at `extremes`, mm^2.
    error
        Estimated relative error of J and the shear compliance (change between quadratic and cubic elements).
    """

    area: float
    yc: float
    zc: float
    Iyy: float
    Izz: float
    Iyz: float
    I1: float
    I2: float
    principal_angle: float
    ys: float
    zs: float
    shear_compliance: NDArray[np.float64]
    J: float
    Iw: float
    open_thin: bool
    extremes: NDArray[np.float64]
    W_top: float
    W_bottom: float
    W_left: float
    W_right: float
    torsion_stress: float
    warping: NDArray[np.float64]
    error: float = 0.0
