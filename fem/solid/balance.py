"""Checks of the solution: load resultants, balance of reactions, work against energy, size of the motion."""

from __future__ import annotations

from collections.abc import Iterator
from typing import SupportsFloat

import numpy as np

from fem.solid.cut import Cutter
from fem.solid.factor import GAUGE_ALLOWED, RESIDUAL_ALLOWED
from fem.solid.kernels.energy import elastic_energy
from fem.solid.kernels.interface import rules
from fem.solid.model import LEAST_QUALITY, SolidModel
from fem.solid.nodal_forces import turns
from fem.solid.reaction import Reactions
from fem.solid.result import Check
from fem.solid.shape import Array
from fem.solid.stiffness import CURVED_ORDER, STRAIGHT_ORDER, lame
from fem.solid.support import rigid_map
from fem.solid.system import Solution
from geometry.part import RemotePoint

BALANCE_ALLOWED = 1e-6
ENERGY_ALLOWED = 1e-8
LARGE_MOTION = 0.05
"""Largest displacement over length up to which small-displacement theory is taken for granted: common practice, no
source."""


def _check(name: str, value: SupportsFloat, allowed: float, note: str = "") -> Check:
    return Check(name, float(value), allowed, float(value) <= allowed, note)


def strain_energies(
    model: SolidModel, u: Array, cutter: Cutter | None = None, threads: int = 1
) -> tuple[Array, Array]:
    """(c,) elastic energy from the stresses, and (c,) int sigma : thermal strain dV; both N mm. u (c, 3, n)."""
    material, cutter = model.part.material, cutter or Cutter(model.mesh)
    lam, mu = lame(material.E, material.nu)
    expansion = material.expansion * model.change
    free = (3 * lam + 2 * mu) * expansion
    constants, quadrature = (material.E, material.nu, lam, mu), rules(STRAIGHT_ORDER, CURVED_ORDER)
    c, _, n = u.shape
    energy, trace = np.empty(c), np.empty(c)
    for some in turns(c):
        count = some.stop - some.start
        wide = 1 << (count - 1).bit_length()  # lanes are 1, 2, 4 or 8
        motion, off = np.zeros((n, 3, wide)), np.zeros(wide)
        motion[:, :, :count], off[:count] = u[some].transpose(2, 1, 0), free[some]
        found = elastic_energy(
            cutter.tets, cutter.curved, cutter.points, motion.reshape(3 * n, wide), constants, off, quadrature, threads
        )
        energy[some], trace[some] = found[0][:count], found[1][:count]
    return energy, expansion * trace


def _moment(x: Array, forces: Array) -> Array:
    """(3,) sum of x cross forces, both (n, 3)."""
    M = x.T @ forces
    return np.array([M[1, 2] - M[2, 1], M[2, 0] - M[0, 2], M[0, 1] - M[1, 0]])


def load_checks(model: SolidModel) -> Iterator[Check]:
    """Resultant force and moment of each load vector against the declared one."""
    x = model.mesh.nodes.T
    resultants = np.asarray(model.load_vectors @ rigid_map(model.mesh.nodes, np.zeros(3)).reshape(-1, 6))
    sizes = np.asarray(abs(model.load_vectors).sum(axis=1)).ravel()
    for load, resultant, size in zip(model.loads.values(), resultants, sizes, strict=True):
        force, moment = resultant[:3], resultant[3:]
        about: Array | None
        if load.force_per_mass.any():
            remote = [p for p in model.part.loads if isinstance(p, RemotePoint)]
            declared = (model.mass + sum(p.mass for p in remote)) * load.force_per_mass
            about = np.cross(model.mass * model.centre_of_mass, load.force_per_mass) + sum(
                (np.cross(p.mass * np.array(p.point), load.force_per_mass) for p in remote), np.zeros(3)
            )
            arm = float(np.ptp(x, axis=0).max())
        elif load.force is None:
            continue
        else:
            declared, about, arm = load.force, load.moment, load.arm
        scale = float(max(np.linalg.norm(declared), np.linalg.norm(about) / arm if about is not None else 0.0,
                          load.push))  # fmt: skip
        scale = scale if scale > 0 else max(float(size), 1e-300)
        yield _check(f"load {load.name}: force", np.linalg.norm(force - declared) / scale, load.force_allowed)
        if about is not None:
            yield _check(f"load {load.name}: moment", np.linalg.norm(moment - about) / (scale * arm), load.allowed)


def balance_checks(
    model: SolidModel, u: Array, reactions: Reactions, energy: Array, thermal: Array, solution: Solution
) -> Iterator[Check]:
    """Reactions against loads, work against energy, residual, gauge, quality, size of the motion."""
    x = model.mesh.nodes.T - model.mesh.nodes.mean(axis=1)
    length, diagonal = float(np.ptp(x, axis=0).max()), model.K.diagonal()
    for k, case in enumerate(model.part.cases):
        applied, heat = model.mechanical[k], model.thermal[k]
        push = np.abs(applied).sum() + np.abs(reactions.nodal[k]).sum() + np.abs(heat).sum()
        stiff, rigid = 0.0, 0.0
        if not applied.any():
            # without loads a motion may be rigid: the forces are then rounding of stiffness times motion
            motion = np.abs(u[k].T).ravel()
            stiff, rigid = float(motion @ diagonal), float(motion**2 @ diagonal)
        scale = max(float(push), 1e-8 * stiff, 1e-300)
        force = applied.sum(axis=0) + sum((f[k] for f in reactions.force.values()), np.zeros(3))
        moment = _moment(x, applied)
        for name, m in reactions.moment.items():
            arm = reactions.centre[name] - model.mesh.nodes.mean(axis=1)
            moment = moment + m[k] + np.cross(arm, reactions.force[name][k])
        yield _check(
            f"case {case.name}: reactions balance the loads (force)", np.linalg.norm(force) / scale, BALANCE_ALLOWED
        )
        yield _check(
            f"case {case.name}: reactions balance the loads (moment)",
            np.linalg.norm(moment) / (scale * length),
            BALANCE_ALLOWED,
        )
        work = float((applied * u[k].T).sum() + (reactions.nodal[k] * u[k].T).sum())
        gap = abs(work - thermal[k] - 2 * energy[k])
        size = max(
            2 * energy[k],
            abs(work),
            abs(thermal[k]),
            abs(float((heat * u[k].T).sum())),
            1e-6 * rigid,
            1e-300,
        )
        # work inherits the rounding of the displacements, which the known field measures (slender parts)
        allowed = max(ENERGY_ALLOWED, 10.0 * solution.gauge)
        yield _check(f"case {case.name}: work is twice the energy", gap / size, allowed)
        yield _check(
            f"case {case.name}: largest displacement over length",
            np.linalg.norm(u[k], axis=0).max() / length,
            LARGE_MOTION,
            "small displacements are assumed",
        )
    yield _check(
        "residual of the equations over the load",
        solution.residual,
        solution.residual_allowed,
        f"rounding of a slender part; correcting it would move the part by {solution.correction:.0e} of its "
        "largest displacement"
        if solution.residual_allowed > RESIDUAL_ALLOWED
        else "",
    )
    yield _check("error of a known bending field", solution.gauge, GAUGE_ALLOWED)
    least = float(model.mesh.quality.min())
    yield Check("least element quality", least, LEAST_QUALITY, least >= LEAST_QUALITY, "must be above")
