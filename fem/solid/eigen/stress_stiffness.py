"""Geometric stiffness of the fixed and of the varying loads of a buckling study."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from fem.solid.eigen.remote import form_rows, lever_form, rigid_form, turn_rows
from fem.solid.geometric import geometric_stiffness
from fem.solid.model import SolidModel, thermal_vector
from fem.solid.region import surface_region
from fem.solid.scalar_matrix import ScalarMatrix
from fem.solid.shape import Array
from fem.solid.stiffness import group_stresses
from fem.solid.support import rigid_regions
from fem.solid.system import HeldSystem
from geometry.part import BodyLoad, Buckling, RemotePoint
from geometry.problem import SolveError

LARGEST_STRAIN = 1.0
"""Factors at which the root mean square of the stress is more than this part of Young's modulus are no buckling but
rounding, or waves as short as the elements."""


@dataclass(frozen=True, slots=True)
class StressStiffness:
    """Geometric stiffness of the part, and weights and rows (r, 3 n) of the levers of remote forces and rigid regions;
    `largest` is the factor beyond which nothing is looked for."""

    part: ScalarMatrix
    weights: Array
    levers: sp.csr_matrix
    largest: float

    def __matmul__(self, u: Array) -> Array:
        out = self.part @ u
        if self.weights.size:
            out += self.levers.T @ (self.weights[:, None] * (self.levers @ u))
        return out

    def rough(self, count: int, seed: int) -> Array:
        """(3 n, count) random vectors whose covariance is at least this matrix, and at least what it is less than."""
        rng, n = np.random.default_rng(seed), self.part.shape[0] // 3
        out = np.sqrt(np.repeat(self.part.sizes(), 3))[:, None] * rng.standard_normal((3 * n, count))
        if self.weights.size:
            size = np.sqrt(np.abs(self.weights))[:, None]
            out += self.levers.T @ (size * rng.standard_normal((self.weights.size, count)))
        return out


def stress_stiffnesses(
    model: SolidModel, system: HeldSystem, u: Array, study: Buckling
) -> tuple[StressStiffness | None, StressStiffness | None]:
    """Geometric stiffness of the fixed and of the varying loads; None where there is no stress.

    Raises
    ------
    SolveError
        When the case of the study is none of the part's.
    """
    part, n = model.part, model.mesh.nodes.shape[1]
    cases = [c.name for c in part.cases]
    if study.case not in cases:
        raise SolveError(f"Buckling is asked for in the case {study.case!r}, and the cases are {', '.join(cases)}.")
    case = cases.index(study.case)
    total = model.factors[case]
    names = list(model.loads)
    held = np.array([f if name in study.fixed else 0.0 for name, f in zip(names, total, strict=True)])
    u_fixed, change, f_fixed = np.zeros((3, n)), 0.0, np.zeros((n, 3))
    if held.any():
        change = float(held @ np.array([load.change for load in model.loads.values()]))
        f_fixed = np.asarray(model.load_vectors.T @ held).reshape(n, 3)
        if change:
            m = part.material
            f_fixed = f_fixed + change * m.expansion * thermal_vector(model.mesh, model.groups, m.E, m.nu)
        y = system.inverse(system.elimination.gather(f_fixed.reshape(-1, 1)))
        u_fixed = system.elimination.expand(y).reshape(n, 3).T
    whole = model.mechanical[case] + model.thermal[case]
    forces = np.array([f_fixed, whole - f_fixed])
    both = np.array([u_fixed, u[case] - u_fixed])
    changes = np.array([change, model.change[case] - change])
    expansion = part.material.expansion * changes
    stress = group_stresses(model.groups, both, part.material.E, part.material.nu, expansion, model.K.threads)
    size = [np.sqrt(sum((s[k] ** 2).sum() for s in stress) / sum(s[k].size for s in stress) * 6) for k in range(2)]
    # stress that is rounding of the motion that makes it is none
    strain = float(np.abs(expansion).max()) + float(np.abs(both).max() / np.ptp(model.mesh.nodes, axis=1).max())
    least = 1e-9 * part.material.E * strain

    def geometric(k: int, factors: Array) -> StressStiffness | None:
        if not size[k] > least:
            return None
        G = geometric_stiffness(model.groups, [s[k] for s in stress], model.K)
        levers = _levers(model, factors, both[k], forces[k])
        return StressStiffness(G, *levers, LARGEST_STRAIN * part.material.E / float(size[k]))

    return geometric(0, held), geometric(1, total - held)


def _levers(model: SolidModel, factors: Array, u: Array, f: Array) -> tuple[Array, sp.csr_matrix]:
    """Weights and rows of the levers of all remote forces under load factors (loads,), and of what keeps rigid regions
    rigid under the displacement u (3, n) that the forces f (n, 3) make."""
    part, mesh = model.part, model.mesh
    by_name = dict(zip(model.loads, factors, strict=True))
    bodies = [load for load in part.loads if isinstance(load, BodyLoad)]
    pull = sum((by_name[load.name] * np.array(load.force_per_mass) for load in bodies), np.zeros(3))
    forms: dict[str, Array] = {}
    for point in part.loads:
        if isinstance(point, RemotePoint):
            force = by_name[point.name] * np.array(point.force) + point.mass * pull
            moment = by_name[point.name] * np.array(point.moment)
            forms[point.on] = forms.get(point.on, np.zeros((3, 3))) + lever_form(mesh, point, force, moment)
    names = rigid_regions(part)
    if names:
        held = (model.K @ np.ascontiguousarray(u.T).reshape(-1, 1)).reshape(-1, 3) - f
        for name in names:
            region = model.constraints.regions[name]
            form = rigid_form(mesh.nodes[:, region.nodes], region.centroid, held[region.nodes])
            forms[name] = forms.get(name, np.zeros((3, 3))) + form
    weights, rows = [np.zeros(0)], [sp.csr_matrix((0, 3 * mesh.nodes.shape[1]))]
    for name, form in forms.items():
        if form.any():
            w, r = form_rows(form, turn_rows(mesh, surface_region(mesh, name)))
            weights.append(w)
            rows.append(r)
    return np.concatenate(weights), sp.csr_matrix(sp.vstack(rows))
