"""Where compiled kernels are kept, what makes them stale, and that a warm process compiles nothing."""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path

import numba
import numpy as np
import pytest
from numba.core import event
from solid_help import box_mesh, box_part

from fem.solid import solve_solid
from fem.solid.geometric import geometric_stiffness
from fem.solid.kernels import cache
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.warm import warm_up
from fem.solid.mass import mass_matrix
from fem.solid.stiffness import element_groups, group_stresses, stiffness_matrix
from geometry.budget import Budget
from geometry.part import BodyLoad, Buckling, RegionLoad, Support, Vibration


class Compiled(event.Listener):
    """Names of the functions that numba compiles."""

    def __init__(self) -> None:
        self.names: list[str] = []

    def on_start(self, event: event.Event) -> None:
        self.names.append(event.data["dispatcher"].py_func.__qualname__)

    def on_end(self, event: event.Event) -> None:
        pass


def test_a_warm_process_compiles_nothing() -> None:
    said: list[str] = []
    warm_up(said.append)
    assert said[0].startswith("the solver's kernels are compiled") and "ready" in said[-1]
    # Another process of the tests may be writing the code of one of its kernels at this very moment.
    deadline = time.monotonic() + 20.0
    while not (warm := cache.is_warm()) and time.monotonic() < deadline:
        time.sleep(0.2)
    assert warm
    listener = Compiled()
    event.register("numba:compile", listener)
    try:
        wall = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
        loads = [RegionLoad("tip", "arm.end", (10.0, 20.0, -30.0)), BodyLoad("weight", (0.0, 0.0, -9810.0))]
        mesh = box_mesh(100.0, 10.0, 20.0, (6, 2, 2))
        for solver in ("cholesky", "multigrid"):
            part = box_part(100.0, 10.0, 20.0, [wall], loads)
            part = replace(part, vibration=Vibration(3), buckling=(Buckling("all", modes=1),))
            solve_solid(part, mesh, Budget(threads=2), solver=solver)
        groups = element_groups(mesh.nodes, mesh.tets)
        K = stiffness_matrix(mesh.nodes, mesh.tets, groups, 210000.0, 0.3)
        mass_matrix(groups, 1.0, K)
        stress = group_stresses(groups, np.zeros((2, *mesh.nodes.shape)), 210000.0, 0.3, np.zeros(2))
        geometric_stiffness(groups, [s[1] for s in stress], K)
        assert K.to_csr().nnz > 2 * K.upper_csr(np.arange(0, K.shape[0], 2)).nnz
        twice = numba.njit(_twice)  # the listener sees what is compiled: this is kept nowhere
        assert twice(2.0) == 4.0
    finally:
        event.unregister("numba:compile", listener)
    assert listener.names == ["_twice"]


def _twice(x):  # type: ignore[no-untyped-def]
    return 2.0 * x


def test_whether_it_is_warm_is_told_without_numba() -> None:
    code = (
        "import sys, time; from fem.solid.kernels.cache import is_warm; begun = time.process_time(); is_warm();"
        "print(time.process_time() - begun, 'numba' in sys.modules, 'skfem' in sys.modules)"
    )
    outcome = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True)
    seconds, *loaded = outcome.stdout.split()
    assert loaded == ["False", "False"]
    assert float(seconds) < 0.2  # 0.03 on a quiet machine


def test_a_changed_file_makes_those_stale_that_build_it_in(monkeypatch: pytest.MonkeyPatch) -> None:
    kernels = cache.SOLID / "kernels"
    names = ("jacobian", "elastic", "nodal", "recovery", "scalar", "pattern")
    before = {name: cache.contents(kernels / f"{name}.py") for name in names}
    changed = dict(cache.sources())
    changed[kernels / "jacobian.py"] += b"\n# changed\n"
    monkeypatch.setattr(cache, "sources", lambda: changed)
    fresh = cache.contents.__wrapped__
    stale = {name for name in names if fresh(kernels / f"{name}.py") != before[name]}
    assert stale == {"jacobian", "elastic", "nodal", "recovery"}


@pytest.fixture
def nowhere(tmp_path: Path) -> Path:
    """A folder that nobody, not even root, can make."""
    (tmp_path / "file").write_text("")
    return tmp_path / "file" / "folder"


def test_the_users_folder_is_taken_where_the_source_cannot_be_written(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, nowhere: Path
) -> None:
    monkeypatch.delenv("NUMBA_CACHE_DIR", raising=False)
    monkeypatch.setattr(cache, "BESIDE", nowhere)
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "mine"))
    find = cache.base_folder.__wrapped__
    assert find() == tmp_path / "mine" / "haunch"
    monkeypatch.setenv("XDG_CACHE_HOME", str(nowhere))
    assert find() is None
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path / "named"))
    assert find() == tmp_path / "named"


def test_what_a_read_only_installation_brings_is_copied(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    brought = tmp_path / "installed" / "kernels-x-1"
    brought.mkdir(parents=True)
    (brought / "code").write_text("machine code")
    monkeypatch.delenv("NUMBA_CACHE_DIR", raising=False)
    monkeypatch.setattr(cache, "BESIDE", brought.parent)
    monkeypatch.setattr(cache, "writable", lambda folder: folder != brought.parent)
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))
    assert cache.base_folder.__wrapped__() == tmp_path / "haunch"
    assert (tmp_path / "haunch" / "kernels-x-1" / "code").read_text() == "machine code"


def test_without_any_folder_kernels_run_uncached(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("fem.solid.kernels.jit.folder_of", lambda path: None)
    thrice = kernel(lambda x: 3.0 * x)
    assert thrice(2.0) == 6.0
    assert thrice._cache.cache_path is None


@pytest.fixture
def run_kept(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Iterator[Callable[[], list[str]]]:
    """Makes a kernel that is kept in a folder and calls it once; gives what was compiled for that."""
    monkeypatch.setattr("fem.solid.kernels.jit.folder_of", lambda path: tmp_path)
    listener = Compiled()
    event.register("numba:compile", listener)

    def run() -> list[str]:
        listener.names.clear()
        assert kernel(_twice)(2.0) == 4.0
        return listener.names

    yield run
    event.unregister("numba:compile", listener)


@pytest.mark.parametrize("kind", ["nbc", "nbi"])
def test_a_damaged_file_is_compiled_again(run_kept: Callable[[], list[str]], tmp_path: Path, kind: str) -> None:
    """A file cut short, empty, of noise, or with one wrong byte in the middle of the machine code."""
    assert run_kept() == ["_twice"]
    assert run_kept() == []
    (path,) = tmp_path.rglob(f"*.{kind}")
    good = path.read_bytes()
    middle = len(good) // 2
    flipped = good[:middle] + bytes([good[middle] ^ 1]) + good[middle + 1 :]
    for bad in (good[:middle], b"", np.random.default_rng(0).bytes(5000), flipped):
        path.write_bytes(bad)
        assert not cache.whole(path)
        assert run_kept() == ["_twice"]
        assert cache.whole(path)
    assert run_kept() == []


def test_a_full_disk_ends_no_run(
    monkeypatch: pytest.MonkeyPatch, run_kept: Callable[[], list[str]], tmp_path: Path
) -> None:
    def full(*arguments: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("numba.core.caching.IndexDataCacheFile._save_index", full)
    assert run_kept() == ["_twice"]
    assert not list(tmp_path.rglob("*.nb?"))


def test_a_damaged_file_is_announced(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """With it the kernels are not ready, so that a run tells its user that it compiles."""
    monkeypatch.setattr(cache, "base_folder", lambda: tmp_path)
    cache.set_warm()
    assert not cache.is_warm()  # there are no files
    for source in cache.sources():
        folder = cache.folder_of(source)
        assert folder is not None
        (folder / "below").mkdir(parents=True)
        (folder / "below" / "f.nbi").write_bytes(cache.sealed(b"index"))
        (folder / "below" / "f.1.nbc").write_bytes(cache.sealed(b"code"))
    assert cache.is_warm()
    (folder / "below" / "f.1.nbc").write_bytes(cache.sealed(b"code")[:-3])
    assert not cache.is_warm()
