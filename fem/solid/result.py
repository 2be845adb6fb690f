"""What the solid model gives back."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fem.figure import Figure
from fem.mode import Mode
from mesher.named_mesh import NamedMesh

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Check:
    """One check of the solution: its value, the largest (or, for a quality, least) allowed one, and the verdict."""

    name: str
    value: float
    allowed: float
    ok: bool
    note: str = ""


@dataclass(frozen=True, slots=True)
class PeakPlace:
    """A local maximum of the von Mises stress.

    Attributes
    ----------
    case, value, position
        Load case; MPa; (3,) mm, global.
    node
        Node index in the mesh.
    regions, faces
        Regions and CAD faces that meet at the node.
    converged
        False where the exact stress is unbounded (rim of a held region, sharp re-entrant edge); `reason` says why.
    principal
        Principal stress of the largest size, MPa, signed.
    """

    case: str
    value: float
    position: tuple[float, float, float]
    node: int
    regions: tuple[str, ...]
    faces: tuple[int, ...]
    converged: bool
    reason: str
    principal: float


@dataclass(frozen=True, slots=True)
class CaseStress:
    """Largest von Mises stress and yield factor (yield strength over it) of a case.

    `established` looks only at nodes away from places where the exact stress is unbounded, `everywhere` at all.
    None where the material has no yield strength or there is no stress.
    """

    case: str
    established: float
    everywhere: float
    yield_factor_established: float | None
    yield_factor_everywhere: float | None


@dataclass(frozen=True, slots=True)
class Denting:
    """Largest displacement (mm) of a loaded region relative to the rigid motion of the member's sections there."""

    case: str
    region: str
    value: float


@dataclass(frozen=True, slots=True)
class SolidResult:
    """Solution of the solid model, all cases.

    Attributes
    ----------
    cases
        Names, in the order of the first axis below.
    mesh
        The mesh that was solved.
    u
        (c, 3, n) displacement, mm, global.
    stress
        (c, 6, n) nodal stress, MPa, global: xx, yy, zz, xy, yz, zx. Volume-weighted mean of the elements' own
        (linear) stresses at the node.
    stress_error
        (c, n) nodal spread: root mean square von Mises difference between the elements' stresses and their mean.
    energy_error
        (c,) energy of that spread over the strain energy: an estimate of the relative error of the energy, and of the
        displacement under the loads (Zienkiewicz and Zhu 1987; low near places of unbounded stress).
    von_mises
        (c, n) MPa.
    figures
        Every figure that the beam model can give too.
    peaks
        Highest local maxima of each case.
    case_stress
        Largest stress and yield factor of each case.
    denting
        Local deformation of the loaded faces, kept apart from the section means.
    section_gap
        (members, stations, c, 6) N, Vy, Vz, T, My, Mz from raw stress over the cut less the equilibrium value: a
        measure of the mesh.
    mass, centre_of_mass
        t and mm, of the meshed part without remote masses.
    external_work
        (c,) half of load times displacement, N mm.
    strain_energy
        (c,) N mm.
    checks
        See `Check`.
    timings
        Seconds of each stage.
    backend
        The solver that was used, ``cholesky (pardiso)``, ``cholesky (lu)`` or ``multigrid``, and
    backend_reason
        why it was chosen, or fallen back to: a sentence.
    vibration, buckling
        Modes, in the order of their size; those of several buckling studies one after the other.
    vibration_shapes, buckling_shapes
        (modes, 3, n) displacement of every node, scaled to a largest size of 1 mm.
    """

    cases: tuple[str, ...]
    mesh: NamedMesh
    u: Array
    stress: Array
    stress_error: Array
    energy_error: Array
    von_mises: Array
    figures: tuple[Figure, ...]
    peaks: tuple[PeakPlace, ...]
    case_stress: tuple[CaseStress, ...]
    denting: tuple[Denting, ...]
    section_gap: Array
    mass: float
    centre_of_mass: Array
    external_work: Array
    strain_energy: Array
    checks: tuple[Check, ...]
    timings: dict[str, float] = field(default_factory=dict)
    backend: str = ""
    backend_reason: str = ""
    vibration: tuple[Mode, ...] = ()
    buckling: tuple[Mode, ...] = ()
    vibration_shapes: Array = field(default_factory=lambda: np.zeros((0, 3, 0)))
    buckling_shapes: Array = field(default_factory=lambda: np.zeros((0, 3, 0)))

    @property
    def principal(self) -> Array:
        """(c, 3, n) principal stresses, MPa, greatest first; worked out at every call."""
        from fem.solid.stress import principal_stresses  # it needs the model, which needs the checks of this file

        return principal_stresses(self.stress)

    @property
    def tresca(self) -> Array:
        """(c, n) greatest less least principal stress, MPa; worked out at every call."""
        principal = self.principal
        return np.asarray(principal[:, 0] - principal[:, 2])
