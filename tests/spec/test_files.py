"""Files that are no spec, and the price of looking at them."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from pathlib import Path

import pytest

from geometry.problem import SpecError
from geometry.spec import part_from_text, read_part
from geometry.spec.read import LARGEST_FILE

CANTILEVER = Path(__file__).with_name("cantilever.toml").read_text(encoding="utf-8")


def said_about(path: Path) -> str:
    with pytest.raises(SpecError) as caught:
        read_part(path)
    assert len(caught.value.problems) == 1
    return str(caught.value)


def said_of(text: str) -> str:
    with pytest.raises(SpecError) as caught:
        part_from_text(text)
    return str(caught.value)


def test_a_file_that_cannot_be_read_is_named(tmp_path: Path) -> None:
    assert said_about(tmp_path / "gone.toml").startswith("gone.toml: given no such file")
    assert "a folder" in said_about(tmp_path)
    latin = tmp_path / "latin.toml"
    latin.write_bytes('title = "ok"\ntitel = "Tr\xe4ger"\n'.encode("latin-1"))
    assert "line 2 that is not UTF-8" in said_about(latin)
    empty = tmp_path / "empty.toml"
    empty.write_text("")
    with pytest.raises(SpecError, match="members: given nothing"):
        read_part(empty)
    with pytest.raises(SpecError):
        read_part(Path("nul\0byte.toml"))


def test_a_huge_file_is_refused_by_its_size_alone(tmp_path: Path) -> None:
    huge = tmp_path / "huge.toml"
    with huge.open("wb") as file:
        file.truncate(40_000_000_000)  # a hole: nothing is stored
    start = time.perf_counter()
    assert "at most 1000000 bytes" in said_about(huge)
    assert time.perf_counter() - start < 2.0
    big = tmp_path / "big.toml"
    big.write_text(CANTILEVER + "#" * (LARGEST_FILE - len(CANTILEVER.encode())))
    assert read_part(big).members


def test_a_mark_of_byte_order_is_no_mistake(tmp_path: Path) -> None:
    marked = tmp_path / "marked.toml"
    marked.write_text(CANTILEVER, encoding="utf-8-sig")
    assert read_part(marked).members


def test_what_never_ends_is_not_read(tmp_path: Path) -> None:
    if not hasattr(os, "mkfifo"):
        pytest.skip("no pipes here")
    pipe = tmp_path / "pipe.toml"
    os.mkfifo(pipe)
    assert "not an ordinary file" in said_about(pipe)


@pytest.mark.parametrize(
    ("old", "new", "place", "word"),
    [
        ('material = "S235"', "material = S235", "line 3, column 12", 'in quotes: material = "S235"'),
        ('material = "S235"', 'material = "S235', "line 3", "closing quote"),
        ('material = "S235"', "material =", "line 3", "Give a value"),
        ('material = "S235"', "material S235", "line 3", "name = value"),
        ('depth = "40 mm"\n', 'depth = "40 mm"\ndepth = "41 mm"\n', "line 8", "each name once"),
        ("[cases.tip_force]", "[cases.tip_force]\n[cases.tip_force]", "line 24", "each table once"),
        ("[limits]", "[limits", "line 30", "[table]"),
        ('["reach", "0 mm", "0 mm"]', '["reach", "0 mm", "0 mm"', "line 13", "closing ]"),
        ('width = "width" }', 'width = "width"', "line 13", "closing }"),
    ],
)
def test_a_text_that_is_not_toml_is_told_by_line_and_column(old: str, new: str, place: str, word: str) -> None:
    said = said_of(CANTILEVER.replace(old, new))
    assert said.startswith(f"part.toml, {place}"), said
    assert word in said


def test_bombs_are_refused_quickly() -> None:
    start = time.perf_counter()
    assert "nested too deeply" in said_of("x = " + "[" * 100_000)
    assert "nested too deeply" in said_of("x = " + "{a=" * 20_000)
    dotted = "x" + ".x" * 450_000 + " = 1\n"  # nests without a single bracket
    for text in (dotted, "material." + dotted, CANTILEVER.replace("[parameters]", f"[parameters]\n{dotted}")):
        assert "nested too deeply" in said_of(text)
    assert "characters" in said_of("#" * (LARGEST_FILE + 1))
    assert said_of("n = " + "9" * 5000)
    long_sum = "+".join(["reach"] * 100_000)
    assert "at most 300 characters" in said_of(CANTILEVER.replace('"40 mm"', f'"{long_sum}"'))
    chain = "\n".join(f'p{k} = "p{k + 1}"' for k in range(400)) + '\np400 = "1 mm"\n'
    assert part_from_text(CANTILEVER.replace("[parameters]", f"[parameters]\n{chain}")).parameters["p0"] == 1.0
    many = "\n".join(f'q{k} = "1 mm"' for k in range(5000))
    assert "at most 500" in said_of(CANTILEVER.replace("[parameters]", f"[parameters]\n{many}"))
    rows = '[[members.bar.holes]]\nalong = "y"\nat = "9 mm"\ncount = 1000\nrows = 1000\npitch = "1 mm"\n'
    rows += 'row_pitch = "1 mm"\ndiameter = "1 mm"\n'
    assert "at most 1000 cuts" in said_of(CANTILEVER.replace("[supports.wall]", rows + "[supports.wall]"))
    assert time.perf_counter() - start < 20.0


def test_reading_a_spec_loads_no_kernel_and_no_numerics() -> None:
    """A fresh process, for here everything may be loaded already."""
    code = (
        "import sys, geometry.spec\n"
        "geometry.spec.read_part(sys.argv[1]); geometry.spec.json_schema(); geometry.spec.spec_reference()\n"
        "heavy = {'cadquery', 'OCP', 'gmsh', 'numpy', 'scipy', 'skfem', 'matplotlib', 'meshio'} & set(sys.modules)\n"
        "print(sorted(heavy))"
    )
    path = Path(__file__).with_name("camera_arm.toml")
    run = subprocess.run(
        [sys.executable, "-c", code, str(path)], capture_output=True, text=True, timeout=60, check=False,
        cwd=Path(__file__).parents[2],
    )  # fmt: skip
    assert run.returncode == 0, run.stderr
    assert run.stdout.strip() == "[]"
