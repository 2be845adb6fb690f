"""Surface loads, sections, section forces, energy and hills against scikit-fem's and scipy's plain paths."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import scipy.sparse as sp
from kernel_help import MESHES, NU, E, Plain, close, pipe, straight
from scipy.sparse.csgraph import connected_components
from skfem import BilinearForm, ElementTetP2, ElementVector, FacetBasis, LinearForm, MeshTet, MeshTet2
from skfem.helpers import ddot, dot, sym_grad, trace
from solid_help import STEEL, box_mesh, box_part, named_mesh

from fem.solid.balance import strain_energies
from fem.solid.cut import Cutter, section_means
from fem.solid.frame import Frame
from fem.solid.kernels.energy import elastic_energy
from fem.solid.kernels.interface import rules
from fem.solid.load import SolidLoad, pressure_piece, surface_vector
from fem.solid.model import build_model
from fem.solid.peak import COUNT, SADDLE, local_maxima, node_sizes, region_rim, surface_graph
from fem.solid.piece import SurfacePiece, Window
from fem.solid.reaction import Reactions
from fem.solid.region import surface_region
from fem.solid.section_force import SectionForces, raw_section_force
from fem.solid.sections import member_sections, section_forces
from fem.solid.shape import TET_EDGES
from fem.solid.stiffness import lame
from fem.solid.strip import TravelledFace
from geometry.part import BodyLoad, StripLoad, Support
from mesher.named_mesh import NamedMesh

KINDS = pytest.mark.parametrize("kind", list(MESHES))
AXES = np.linalg.qr(np.array([[1.0, 0.2, -0.3], [0.1, 1.0, 0.4], [0.3, -0.2, 1.0]]))[0].T
"""A frame that no element face follows."""


@BilinearForm
def elasticity(u, v, w):  # type: ignore[no-untyped-def]
    lam, mu = lame(E, NU)
    return lam * trace(sym_grad(u)) * trace(sym_grad(v)) + 2 * mu * ddot(sym_grad(u), sym_grad(v))


def fields(mesh: NamedMesh) -> np.ndarray:
    """(2, 3, n) two displacement fields."""
    x, y, z = mesh.nodes / 10.0
    return 1e-3 * np.array(
        [[np.sin(x + 2 * y) + z**2, np.cos(x - z) * y, x * y * z], [y * z, np.exp(-x) * z, np.sin(x * y)]]
    )


def frame_of(mesh: NamedMesh) -> tuple[Frame, np.ndarray]:
    """A tilted frame and five stations inside the mesh."""
    frame = Frame(mesh.nodes.mean(axis=1), AXES, float(np.ptp(mesh.nodes)))
    x = frame.local(mesh.nodes)[0]
    return frame, x.min() + np.ptp(x) * np.array([0.12, 0.3, 0.48, 0.71, 0.9])


def plain_model(mesh: NamedMesh, change: float = 0.0) -> SimpleNamespace:
    """What the section forces and the energy ask of a model, without loads."""
    part, changes = SimpleNamespace(material=STEEL), np.array([0.0, change])
    return SimpleNamespace(mesh=mesh, part=part, loads={}, factors=np.zeros((2, 0)), change=changes)


@KINDS
def test_surface_load_is_scikit_fems(kind: str) -> None:
    mesh = MESHES[kind]()
    plain = Plain(mesh, 2)
    middle = mesh.nodes[:, mesh.boundary[:3]].mean(axis=1)
    facets = mesh.boundary[:, middle[0] > np.median(middle[0])]
    wanted = {tuple(t) for t in np.sort(facets[:3], axis=0).T.tolist()}
    ids = [k for k, t in enumerate(np.sort(plain.mesh.facets, axis=0).T.tolist()) if tuple(t) in wanted]
    A, b = np.array([[0.1, -0.2, 0.3], [0.4, 0.1, 0.0], [-0.3, 0.2, 0.5]]), np.array([1.0, -2.0, 0.5])

    @LinearForm
    def push(v, w):  # type: ignore[no-untyped-def]
        return dot(np.einsum("ij,j...->i...", A, w.x) + b[:, None, None] - 0.7 * w.n, v)

    basis = FacetBasis(plain.mesh, ElementVector(ElementTetP2()), facets=np.array(ids), intorder=6)
    expected = np.asarray(push.assemble(basis))[plain.place].reshape(-1, 3)
    piece = SurfacePiece(facets, lambda x, n: np.einsum("ij,j...->i...", A, x) + b.reshape(3, 1, 1) - 0.7 * n)
    assert facets.shape[1] == len(ids) > 10
    assert surface_vector(mesh, piece) == pytest.approx(expected, abs=1e-13 * np.abs(expected).max() * 10)


@KINDS
def test_strip_over_a_whole_region_is_scikit_fems_even_load(kind: str) -> None:
    mesh = MESHES[kind]()
    plain = Plain(mesh, 2)
    regions = {**mesh.facets, "bar.all": mesh.boundary}
    object.__setattr__(mesh, "facets", regions)
    frame = Frame(mesh.nodes.mean(axis=1), AXES, float(np.ptp(mesh.nodes)))
    force = np.array([30.0, -20.0, -100.0])
    face = TravelledFace(mesh.nodes, surface_region(mesh, "bar.all"), frame)
    pieces, _, _ = face.strips(StripLoad("t", "bar.all", (0.0,), 1e3, tuple(force)))
    got = sum(surface_vector(mesh, piece) for piece in pieces)
    basis = FacetBasis(plain.mesh, ElementVector(ElementTetP2()), intorder=8)
    area = float(np.asarray(basis.dx).sum())
    even = LinearForm(lambda v, w: dot((force / area)[:, None, None], v))
    expected = np.asarray(even.assemble(basis))[plain.place].reshape(-1, 3)
    # flat facets are exact; curved ones have an area element that is no polynomial
    assert got == pytest.approx(expected, abs=(1e-12 if kind == "straight" else 1e-5) * np.abs(expected).max())


@KINDS
def test_clipped_pressure_adds_up_to_the_whole(kind: str) -> None:
    mesh = MESHES[kind]()
    object.__setattr__(mesh, "facets", {**mesh.facets, "bar.all": mesh.boundary})
    frame, stations = frame_of(mesh)
    whole = pressure_piece(surface_region(mesh, "bar.all"), 2.0)
    edges = np.r_[-1e3, stations, 1e3]
    parts = [
        surface_vector(mesh, SurfacePiece(whole.facets, whole.traction, Window(frame, low, high)))
        for low, high in zip(edges, edges[1:], strict=False)
    ]
    expected = surface_vector(mesh, whole)  # a pressure's vector area is polynomial on curved facets too
    assert sum(parts) == pytest.approx(expected, abs=1e-12 * np.abs(expected).max())


@KINDS
def test_sections_are_scikit_fems_interpolation(kind: str) -> None:
    mesh = MESHES[kind]()
    plain, u = Plain(mesh, 2), fields(mesh)
    mapping, element, cutter = plain.mesh.mapping(), ElementTetP2(), Cutter(mesh)
    frame, stations = frame_of(mesh)
    lam, mu = lame(STEEL.E, STEEL.nu)
    model = plain_model(mesh, 30.0)
    free = (3 * lam + 2 * mu) * STEEL.expansion * model.change
    for at in stations[::2]:
        cut = cutter.cut(frame, float(at))
        X, own, w = cut.bary[1:, :, None], cut.elements, cut.weights
        assert close(cut.bary.sum(axis=0), np.ones(w.size), abs=1e-14)
        x = mapping.F(X, own)[:, :, 0]
        assert close(frame.local(x), cut.points, abs=1e-12 * frame.length)
        field, H = np.zeros((2, 3, w.size)), np.zeros((2, 3, 3, w.size))
        for a in range(10):
            basis = element.gbasis(mapping, X, a, own)[0]
            here = u[:, :, mesh.tets[a, own]]
            field += here * np.asarray(basis)[:, 0]
            H += here[:, :, None] * np.asarray(basis.grad)[:, :, 0]
        mean, turn = section_means(cut, u, frame)
        arms = x - (x @ w / w.sum())[:, None]
        inertia = np.einsum("p,ip,ip->", w, arms, arms) * np.eye(3) - np.einsum("p,ip,jp->ij", w, arms, arms)
        for c in range(2):
            assert mean[c] == pytest.approx(field[c] @ w / w.sum(), rel=1e-11)
            moment = np.cross(arms, field[c], axis=0) @ w
            assert turn[c] == pytest.approx(np.linalg.solve(inertia, moment), rel=1e-9)
            S = mu * (H[c] + H[c].transpose(1, 0, 2)) + (lam * np.trace(H[c]) - free[c]) * np.eye(3)[:, :, None]
            t = np.einsum("ki,ijp,j->kp", AXES, S, AXES[0]) * w
            y, z = cut.points[1:]
            raw = raw_section_force(model, cut, u, frame)[c]
            expected = [*t.sum(axis=1), (y * t[2] - z * t[1]).sum(), (z * t[0]).sum(), -(y * t[0]).sum()]
            assert raw[:3] == pytest.approx(expected[:3], abs=1e-10 * np.abs(t).sum())
            assert raw[3:] == pytest.approx(expected[3:], abs=1e-10 * np.abs(t).sum() * frame.length)


def test_a_quadratic_field_is_integrated_exactly_over_a_section() -> None:
    mesh = straight()  # 40 x 20 x 10 about the x axis
    x, y, z = mesh.nodes
    u = 1e-3 * np.array([[x**2 + y**2 + x * z, x * y + z**2, y * z - x * z]])
    frame = Frame(np.zeros(3), np.eye(3), 40.0)
    for at in (7.7, 10.0, 33.3):
        cut = Cutter(mesh).cut(frame, at)
        assert cut.area == pytest.approx(200.0, rel=1e-12)
        mean, turn = section_means(cut, u, frame)
        assert mean[0] == pytest.approx(1e-3 * np.array([at**2 + 400 / 12, 100 / 12, 0.0]), abs=1e-13)
        # u_x = at z turns about y; u_y = at y and u_z = -at z turn nothing
        assert turn[0] == pytest.approx([0.0, 1e-3 * at, 0.0], abs=1e-14)


def test_a_curved_section_converges_at_second_order() -> None:
    # quarter of a pipe 8..11: int y^2 dA = pi / 16 (R^4 - r^4). Chords of a quarter of the element's length: the error
    # falls with the square of the size, from a small one
    errors = []
    for cells in (2, 4):
        grid = MeshTet2.from_mesh(
            MeshTet.init_tensor(
                np.linspace(8, 11, cells + 1), np.linspace(0, np.pi / 2, 2 * cells + 1), np.linspace(0, 9, cells + 1)
            )
        )
        r, angle, z = grid.doflocs
        mesh = named_mesh(MeshTet2(np.array([r * np.cos(angle), r * np.sin(angle), z]), grid.t), {})
        frame = Frame(np.zeros(3), np.array([[0.0, 0, 1], [1, 0, 0], [0, 1, 0]]), 9.0)
        cut = Cutter(mesh).cut(frame, 4.1)
        mean, _ = section_means(cut, np.array([[mesh.nodes[1] ** 2, 0 * z, 0 * z]]), frame)
        errors.append(abs(mean[0, 0] * cut.area - np.pi / 16 * (11.0**4 - 8.0**4)))
    assert errors[0] < 1e-3 * np.pi / 16 * (11.0**4 - 8.0**4)
    assert errors[1] < errors[0] / 3


@KINDS
def test_section_force_is_what_holds_the_far_part(kind: str) -> None:
    # any displacements are held by scikit-fem's own nodal forces K u: the section force is the sum of those beyond
    mesh = MESHES[kind]()
    plain, u = Plain(mesh, 4), fields(mesh)
    K = plain.matrix(elasticity)
    r = np.array([(K @ v.T.ravel()).reshape(-1, 3) for v in u])  # type: ignore[operator]
    frame, stations = frame_of(mesh)
    solved = SectionForces(plain_model(mesh), Cutter(mesh), u, r)  # type: ignore[arg-type]
    everything = np.ones(mesh.tets.shape[1], dtype=bool)
    for at in stations:
        beyond = frame.local(mesh.nodes)[0] >= at
        arms = mesh.nodes[:, beyond].T - frame.point(float(at))
        for c in range(2):
            got = solved.at(frame, float(at), everything)[c]
            size = np.abs(r[c]).sum()
            assert got[:3] == pytest.approx(AXES @ r[c, beyond].sum(axis=0), abs=1e-12 * size)
            moment = np.cross(arms, r[c, beyond]).sum(axis=0)
            assert got[3:] == pytest.approx(AXES @ moment, abs=1e-12 * size * frame.length)


def test_a_force_for_a_volume_is_shared_out_at_the_plane_on_curved_elements() -> None:
    # the pipe along its axis z: what lies beyond the plane weighs its length times the mesh's own cross section
    mesh, b = pipe(), np.array([100.0, -2000.0, 300.0])
    plain, u = Plain(mesh, 4), fields(mesh)
    K, density = plain.matrix(elasticity), STEEL.density
    weigh = LinearForm(lambda v, w: dot(density * b[:, None, None] * np.ones_like(w.x[0]), v))
    f = plain.vector(weigh).reshape(-1, 3)
    r = np.array([(K @ v.T.ravel()).reshape(-1, 3) - f for v in u])  # type: ignore[operator]
    frame = Frame(np.zeros(3), np.array([[0.0, 0, 1], [1, 0, 0], [0, 1, 0]]), 9.0)
    model = plain_model(mesh)
    model.loads, model.factors = {"weight": SolidLoad("weight", force_per_mass=b)}, np.ones((2, 1))
    solved = SectionForces(model, Cutter(mesh), u, r)
    section = float(np.asarray(plain.basis.dx).sum()) / 9.0
    for at in (0.5, 1.0, 3.7, 7.1):
        beyond = mesh.nodes[2] >= at - 1e-9
        force = frame.axes @ (r[:, beyond].sum(axis=1) + density * b * section * (9.0 - at)).T
        got = solved.at(frame, at, np.ones(mesh.tets.shape[1], dtype=bool))[:, :3]
        assert got == pytest.approx(force.T, abs=1e-6 * density * 2000.0 * section * 9.0)


@KINDS
def test_energy_is_scikit_fems(kind: str) -> None:
    mesh = MESHES[kind]()
    plain, u = Plain(mesh, 4), fields(mesh)
    K = plain.matrix(elasticity)
    model = plain_model(mesh, 25.0)
    threaded = strain_energies(model, u, threads=3)
    energy, thermal = strain_energies(model, u)
    assert np.array_equal(threaded[0], energy) and np.array_equal(threaded[1], thermal)
    assert energy[0] == pytest.approx(0.5 * u[0].T.ravel() @ (K @ u[0].T.ravel()), rel=1e-12)  # type: ignore[operator]
    # with expansion e: sigma = sigma_u - b 1, b = (3 lam + 2 mu) e; tr sigma = b / e tr eps - 3 b
    lam, mu = lame(E, NU)
    strain = STEEL.expansion * 25.0
    b = (3 * lam + 2 * mu) * strain

    @LinearForm
    def dilation(v, w):  # type: ignore[no-untyped-def]
        return trace(sym_grad(v))

    grown = plain.vector(dilation) @ u[1].T.ravel()
    volume = float(np.asarray(plain.basis.dx).sum())
    assert thermal[1] == pytest.approx(strain * (b / strain * grown - 3 * b * volume), rel=1e-11)
    straining = 0.5 * u[1].T.ravel() @ (K @ u[1].T.ravel())  # type: ignore[operator]
    # energy of the elastic strain eps - e 1: that of eps, less b tr eps, and 3 e b / 2 for a volume
    assert energy[1] == pytest.approx(straining - b * grown + 1.5 * strain * b * volume, rel=1e-11)


@KINDS
def test_energies_of_cases_side_by_side_are_those_of_each(kind: str) -> None:
    mesh = MESHES[kind]()
    rng = np.random.default_rng(6)
    u = np.einsum("kf,fin->kin", rng.standard_normal((11, 2)), fields(mesh))
    model = plain_model(mesh)
    model.change = 25.0 * rng.standard_normal(11)
    every = strain_energies(model, u)
    for count in (1, 2, 3, 5, 8):
        model.change, changes = model.change[:count], model.change
        some = strain_energies(model, u[:count])
        for a, b in zip(some, every, strict=True):
            assert a == pytest.approx(b[:count], rel=1e-12)
        model.change = changes
    plain = Plain(mesh, 4)
    K = plain.matrix(elasticity)
    model.change = np.zeros(11)
    energy, thermal = strain_energies(model, u)
    straining = [0.5 * v.T.ravel() @ (K @ v.T.ravel()) for v in u]  # type: ignore[operator]
    assert energy == pytest.approx(straining, rel=1e-12) and not thermal.any()
    cutter, constants = Cutter(mesh), (E, NU, *lame(E, NU))
    wide, off = np.random.default_rng(7).standard_normal((mesh.nodes.size, 16)), np.arange(16.0)
    both = [elastic_energy(cutter.tets, cutter.curved, cutter.points, wide[:, some], constants, off[some],
                           rules(2, 4), 1) for some in (slice(0, 8), slice(8, 16), slice(0, 16))]  # fmt: skip
    for first, last, together in zip(*both, strict=True):
        assert np.array_equal(np.r_[first, last], together)
    with pytest.raises(ValueError, match="3 cases"):
        elastic_energy(*[np.zeros(0)] * 3, np.zeros((3, 3)), (1.0,) * 4, np.zeros(3), rules(2, 4), 1)  # type: ignore[arg-type]


def test_threads_give_the_same_sections() -> None:
    mesh = box_mesh(100.0, 10.0, 20.0, (7, 2, 3))
    loads = (BodyLoad("self_weight", (0.0, 3.0, -9810.0)), StripLoad("t", "arm.top", (42.0,), 9.0, (1.0, 2.0, -9.0)))
    hold = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
    model = build_model(box_part(100.0, 10.0, 20.0, [hold], loads), mesh)
    u, none = fields(mesh)[:1], Reactions(np.zeros((1, mesh.nodes.shape[1], 3)), {}, {}, {})
    found = []
    for threads in (1, 2, 5):
        cutter = Cutter(mesh)
        found.append(section_forces(model, u, none, member_sections(model, cutter, threads), cutter, threads))
    for forces, gap in found[1:]:
        assert np.array_equal(forces["arm"], found[0][0]["arm"]) and np.array_equal(gap, found[0][1])


def plain_hills(mesh: NamedMesh, values: np.ndarray, near: np.ndarray) -> list[int]:
    """Local maxima in falling order, each unless it is joined to a greater one of its kind above the saddle."""
    halves = ((0, 3), (3, 1), (1, 4), (4, 2), (2, 5), (5, 0), (3, 4), (4, 5), (5, 3))
    rows, columns = (np.concatenate([mesh.boundary[pair[k]] for pair in halves]) for k in (0, 1))
    n = mesh.nodes.shape[1]
    graph = sp.coo_matrix((np.ones(rows.size), (rows, columns)), shape=(n, n)).tocsr()
    graph = (graph + graph.T).tocsr()
    own = np.repeat(np.arange(n), np.diff(graph.indptr))
    highest = np.zeros(n)
    np.maximum.at(highest, own, values[graph.indices])
    tops = np.flatnonzero((values >= highest) & (values > 0) & (np.diff(graph.indptr) > 0))
    accepted: list[int] = []
    for node in tops[np.argsort(-values[tops], kind="stable")][:200]:
        above = np.flatnonzero(values >= SADDLE * values[node])
        _, label = connected_components(graph[above][:, above], directed=False)
        rivals = [i for i in accepted if near[i] == near[node]]
        if (label[np.searchsorted(above, rivals)] == label[np.searchsorted(above, node)]).any():
            continue
        accepted.append(int(node))
    return accepted


def test_hills_are_those_of_the_plain_search() -> None:
    mesh = box_mesh(100.0, 30.0, 20.0, (14, 4, 3))
    rng = np.random.default_rng(8)
    x, y, z = mesh.nodes
    lengths = set()
    for seed in range(12):
        waves = 1.2 + np.sin(x / (3 + seed) + y / 4) * np.cos(z / 5 - x / 9)
        values = np.abs(waves + 0.2 * rng.random(x.size)) * (1.0 + x / 150.0)
        near = rng.integers(-1, 1 + seed % 3, size=x.size)  # kinds that cross the hills
        got = local_maxima(surface_graph(mesh), values, near)
        expected = plain_hills(mesh, values, near)
        assert len(got) >= min(COUNT, len(expected))
        assert got == expected[: len(got)]
        lengths.add(len(expected))
    assert max(lengths) >= COUNT and len(lengths) > 3  # hills are many and few: the comparison says something
    assert local_maxima(surface_graph(mesh), np.zeros(x.size), near) == []


def test_node_sizes_and_rims_are_the_plain_ones() -> None:
    mesh = pipe()
    ends = mesh.nodes[:, mesh.tets[TET_EDGES]]
    mean = np.linalg.norm(ends[:, :, 0] - ends[:, :, 1], axis=0).mean(axis=0)
    expected = np.zeros(mesh.nodes.shape[1])
    for i in range(expected.size):
        expected[i] = mean[(mesh.tets == i).any(axis=0)].mean()
    assert node_sizes(mesh) == pytest.approx(expected, rel=1e-13)
    mesh = box_mesh(100.0, 10.0, 20.0, (5, 2, 4))
    rim = region_rim(mesh, "arm.start")
    on = np.isclose(mesh.nodes[0], 0.0) & (np.isclose(abs(mesh.nodes[1]), 5.0) | np.isclose(abs(mesh.nodes[2]), 10.0))
    assert np.array_equal(rim, mesh.nodes[:, on])
