"""The page in headless Chromium: no errors, sorting, pointing and choosing work, it prints.

Needs a Chromium and the package playwright, which drives it; without them these tests are skipped, and say so.
"""

from __future__ import annotations

import base64
import dataclasses
import math
import re
import shutil
import time
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from studies.report.study.page import study_page
from studies.report.study.ranking import best_front
from studies.report.tables import digits

CHROMIUM = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
playwright = pytest.importorskip("playwright.sync_api", reason="the package playwright is not installed")
pytestmark = pytest.mark.skipif(CHROMIUM is None, reason="no Chromium on this machine (apt-get install chromium)")

PIXEL = "iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAQAAAC1HAwCAAAAC0lEQVR42mNkYAAAAAYAAjCB0C8AAAAASUVORK5CYII="
FLAGS = ("--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
         "--disable-component-update", "--disable-sync")


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    with playwright.sync_playwright() as driver:
        chromium = driver.chromium.launch(executable_path=CHROMIUM, args=list(FLAGS))
        yield chromium
        chromium.close()


class Opened:
    """A page with everything that it complained of and asked for."""

    def __init__(self, browser: Any, file: Path) -> None:
        self.complaints: list[str] = []
        self.asked: list[str] = []
        self.page = browser.new_page(viewport={"width": 1280, "height": 900})
        self.page.on("console", lambda message: self.complaints.append(message.text))
        self.page.on("pageerror", lambda error: self.complaints.append(str(error)))
        self.page.on("request", lambda request: self.asked.append(request.url))
        self.page.goto(file.as_uri())
        self.page.wait_for_selector("body[data-ready=yes]", timeout=120_000)


def opened(browser: Any, folder: Path, data: Any, name: str = "page") -> Opened:
    file = folder / f"{name}.html"
    file.write_text(study_page(data), encoding="utf-8")
    return Opened(browser, file)


@pytest.fixture(scope="module")
def grid(browser: Any, samples: ModuleType, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Any]:
    folder, data = tmp_path_factory.mktemp("grid"), samples.grid()
    (folder / "kept run").mkdir()
    (folder / "kept run" / "part.png").write_bytes(base64.b64decode(PIXEL))
    rows = [dataclasses.replace(row, run="kept%20run/", pictures=("kept%20run/part.png",)) if row.number == 53 else row
            for row in data.rows]
    found = opened(browser, folder, dataclasses.replace(data, rows=tuple(rows)))
    yield found
    assert found.complaints == []
    assert [url.rpartition("/")[2] for url in found.asked] in (["page.html"], ["page.html", "part.png"])
    found.page.close()


SPOT = """([id, name, at]) => {
    const plot = document.getElementById(id), box = plot.getBoundingClientRect(), full = plot._fullLayout;
    const trace = plot.data.find((one) => one.name && one.name.startsWith(name));
    return [box.left + full._size.l + full.xaxis.d2p(trace.x[at]),
            box.top + full._size.t + full.yaxis.d2p(trace.y[at])];
}"""
"""Where a point of a picture is on the screen."""


def comes(page: Any, where: str, start: str) -> None:
    """Wait for a text; the page's policy forbids what the driver would wait with."""
    deadline = time.monotonic() + 10
    while not page.locator(where).first.text_content().startswith(start):
        assert time.monotonic() < deadline, page.locator(where).first.text_content()
        page.wait_for_timeout(50)


def column(page: Any, key: str) -> list[str]:
    heads = page.locator("#table thead th").evaluate_all("cells => cells.map(c => c.dataset.key)")
    return page.locator(f"#table tbody td:nth-child({heads.index(key) + 1})").all_text_contents()


def test_it_fits_1280_pixels_without_errors(grid: Opened) -> None:
    assert grid.complaints == []
    assert grid.page.evaluate("document.documentElement.scrollWidth") <= 1280
    assert grid.page.locator("#tradeoff-plot.js-plotly-plot, #lines-plot.js-plotly-plot").count() == 2
    assert grid.page.evaluate("getComputedStyle(document.body).fontSize") == "14px"


def test_the_script_writes_the_same_first_sheet(grid: Opened, samples: ModuleType) -> None:
    """What stood there before the script ran is what the script has put there."""
    file = Path(grid.page.evaluate("decodeURIComponent(location.pathname)"))
    before = re.search(r'<table id="table">.*?<tbody>(.*?)</tbody>', file.read_text(encoding="utf-8"), re.S)
    assert before is not None
    rows = [[re.sub(r"<[^>]*>", "", cell) for cell in re.findall(r"<td[^>]*>(.*?)</td>", row, re.S)]
            for row in re.findall(r"<tr>(.*?)</tr>", before[1], re.S)]
    now = grid.page.locator("#table tbody tr").evaluate_all("rows => rows.map(r => [...r.cells].map(c => c.innerText))")
    assert len(rows) == 25 and rows == now


def test_sorting_by_a_column(grid: Opened) -> None:
    head = grid.page.locator('#table th[data-key="figure:deflection"]')
    head.locator("button").click()
    values = [float(text) for text in column(grid.page, "figure:deflection")]
    assert values == sorted(values) and len(set(values)) > 10
    assert head.get_attribute("aria-sort") == "ascending"
    head.locator("button").click()
    values = [float(text) for text in column(grid.page, "figure:deflection")]
    assert values == sorted(values, reverse=True)
    assert head.get_attribute("aria-sort") == "descending"
    head.focus()
    grid.page.locator('#table th[data-key="governs"] button').focus()
    grid.page.keyboard.press("Enter")
    words = column(grid.page, "governs")
    assert words == sorted(words) and head.get_attribute("aria-sort") is None


def test_choosing_what_is_listed_and_turning_sheets(grid: Opened) -> None:
    page = grid.page
    page.select_option("#which", "meet")
    first = column(page, "number")
    page.get_by_label("next sheet").click()
    second = column(page, "number")
    assert len(first) == 25 and len(second) == 7 and not set(first) & set(second)
    page.select_option("#which", "failed")
    assert column(page, "number") == ["12", "33"]
    assert column(page, "word")[0].startswith("failed: mesh: meshing took longer than")
    page.select_option("#which", "suspicious")
    assert column(page, "word") == ["! suspicious"] * 3
    page.select_option("#which", "meet")


def test_pointing_at_a_mark_tells_its_variant(grid: Opened) -> None:
    page = grid.page
    page.locator("#tradeoff").scroll_into_view_if_needed()
    at = page.evaluate("""document.getElementById("tradeoff-plot").data
        .find((one) => one.name.startsWith("~ explained, limits met")).customdata.indexOf(placeOf.get(60))""")
    spot = page.evaluate(SPOT, ["tradeoff-plot", "~ explained, limits met", at])
    page.mouse.move(spot[0] - 40, spot[1] + 40)
    page.mouse.move(*spot)
    page.wait_for_selector("#tradeoff-plot .hoverlayer .hovertext", timeout=10_000)
    told = page.locator("#tradeoff-plot .hoverlayer").text_content()
    for text in ("variant 60", "root_depth 72 mm", "mass 0.6415 kg", "deflection 0.118 mm", "~ explained", "= met"):
        assert text in told, told
    page.mouse.click(*spot)
    comes(page, "#detail h3", "Variant 60:")


def drawn(page: Any, name: str) -> list[list[float]]:
    return page.evaluate("""(name) => {
        const trace = document.getElementById("tradeoff-plot").data.find((one) => one.name === name);
        return trace ? trace.x.map((x, i) => [x, trace.y[i]]) : []; }""", name)


def test_the_best_front_is_that_of_all_pairs(grid: Opened, samples: ModuleType) -> None:
    page = grid.page
    page.select_option("#across", "mass")
    page.select_option("#up", "deflection")
    rows = [row.outcome for row in samples.grid().rows if row.outcome.judgement == "explained"]
    points = [(1e3 * o.figures["mass"].solid, o.figures["deflection"].solid) for o in rows
              if o.figures["stress"].solid <= 7.6]
    front = [points[i] for i in best_front(points, (float, float))]
    assert drawn(page, "best front") == [pytest.approx(p, rel=1e-5) for p in front]
    assert len(front) > 4


def test_other_axes_by_the_select_boxes(grid: Opened) -> None:
    page = grid.page
    page.select_option("#up", "stress")
    assert page.evaluate('document.getElementById("tradeoff-plot").layout.yaxis.title.text') == "stress (MPa)"
    assert len(drawn(page, "best front")) > 2
    page.select_option("#across", "axis:web")
    assert drawn(page, "best front") == []
    assert page.locator("#tradeoff-note").inner_text().startswith("No front is drawn")
    page.select_option("#across", "left:deflection")
    assert page.evaluate('document.getElementById("tradeoff-plot").layout.xaxis.title.text') == (
        "left of limit deflection (%)")
    page.select_option("#across", "mass")
    page.select_option("#up", "deflection")


def test_judgement_is_told_by_shape_and_word(grid: Opened) -> None:
    traces = grid.page.evaluate("""document.getElementById("tradeoff-plot").data.filter((t) => t.mode === "markers")
        .map((t) => [t.name, t.marker.symbol])""")
    shapes = {name.split(" (")[0]: shape for name, shape in traces}
    assert shapes["~ explained, limits met"] == "square" and shapes["~ explained, limits missed"] == "square-open"
    assert shapes["! suspicious, limits met"] == "triangle-up"


def test_effects_are_drawn_when_they_are_looked_at(grid: Opened) -> None:
    """The value that moves the figure most comes first; tip_depth does nothing to the stress and is not drawn."""
    page = grid.page
    page.locator(".effect-plot").last.scroll_into_view_if_needed()
    page.wait_for_selector(".effect-plot:nth-of-type(1).js-plotly-plot")
    page.wait_for_timeout(300)
    titles = page.locator(".effect-plot").last.evaluate("""(plot) => [plot.layout.xaxis, plot.layout.xaxis2,
        plot.layout.xaxis3].map((axis) => axis ? axis.title.text : null)""")
    assert titles == ["root_depth (mm)", "web (mm)", None]


def test_one_variant_on_demand(grid: Opened) -> None:
    page = grid.page
    page.fill("#wanted", "7")
    page.click("#ask button")
    text = page.locator("#detail").inner_text()
    assert text.startswith("Variant 7: ! suspicious")
    for part in ("displacement z at arm.end: remainder 0.07 mm", "at most 0.21 mm", "missed by",
                 "haunch again camera_arm_plan.study 7", "61234 unknowns"):
        assert part in text, part
    page.fill("#wanted", "600")
    page.click("#ask button")
    assert "There is no variant 600" in page.locator("#ask-note").inner_text()
    page.fill("#wanted", "12")
    page.click("#ask button")
    assert "Failed in stage mesh: meshing took longer than 312 s" in page.locator("#detail").inner_text()
    page.locator("#choose button.look").first.click()
    assert page.locator("#detail").inner_text().startswith("Variant 37: ~ explained, limits = met")


def test_a_kept_run_is_linked_with_its_pictures(grid: Opened) -> None:
    page = grid.page
    page.fill("#wanted", "53")
    page.click("#ask button")
    links = page.locator("#detail a").evaluate_all("links => links.map(a => a.getAttribute('href'))")
    assert links == ["kept%20run/", "kept%20run/summary.md", "kept%20run/part.png"]
    page.locator("#detail img").scroll_into_view_if_needed()
    for _ in range(100):
        if page.locator("#detail img").evaluate("image => image.complete && image.naturalWidth"):
            break
        page.wait_for_timeout(50)
    assert page.locator("#detail img").evaluate("image => image.naturalWidth") == 1


def test_the_line_under_the_pointer_is_followed(grid: Opened) -> None:
    page = grid.page
    page.locator("#lines").scroll_into_view_if_needed()
    spot = page.evaluate(SPOT, ["lines-plot", "variant 37", 3])
    page.mouse.move(spot[0] - 60, spot[1])
    page.mouse.move(*spot)
    comes(page, "#lines-note", "Variant 37: root_depth 66 mm")


def test_numbers_are_written_as_in_the_tables_of_a_run(grid: Opened) -> None:
    values = [0.0, 1.0, -1.5, 15000.0, 123456.0, 9999999.0, 12345678.0, 0.00012345, 0.000012345, 1e-7, 99995.0, 9999.5,
              0.99999, 7.5, 100.0, 2.5e11, -0.03021, 12.3456, 1234.5, 10000.0, 6.0e-5]
    values += [s * m * 10.0**p for p in range(-8, 12) for m in (1.2345, 9.9996, 3.1) for s in (1, -1)]
    assert grid.page.evaluate("(values) => values.map(digits)", values) == [digits(v) for v in values]


def test_printed(grid: Opened, tmp_path: Path) -> None:
    """A4 across, every section on it, no control that paper cannot work."""
    pdf = grid.page.pdf(prefer_css_page_size=True)
    assert pdf.startswith(b"%PDF")
    boxes = {tuple(map(float, box.split())) for box in re.findall(rb"/MediaBox\s*\[([^\]]+)\]", pdf)}
    assert all(math.isclose(b[2], 842, abs_tol=2) and math.isclose(b[3], 595, abs_tol=2) for b in boxes) and boxes
    assert 4 <= len(re.findall(rb"/Type\s*/Page\b", pdf)) <= 12
    if shutil.which("pdftotext"):
        import subprocess

        (tmp_path / "page.pdf").write_bytes(pdf)
        text = subprocess.run(["pdftotext", "-layout", tmp_path / "page.pdf", "-"], capture_output=True, text=True,
                              timeout=60, check=True).stdout
        for part in ("Variant 37 is the lightest", "What ran", "Ranking", "Trade-off", "What moves what", "All at once",
                     "One variant", "Cautions", "best front"):
            assert part in text, part
        assert "Across" not in text and "Show it" not in text


def test_nothing_in_a_name_runs(browser: Any, samples: ModuleType, tmp_path: Path) -> None:
    found = opened(browser, tmp_path, samples.hostile())
    page = found.page
    assert page.locator(".effect-plot").count() == 4 and page.locator(".effect-plot.js-plotly-plot").count() == 0
    page.pdf()
    assert page.locator(".effect-plot.js-plotly-plot").count() == 4, "what was not looked at is not on paper"
    for number in (3, 5, 11):
        page.fill("#wanted", str(number))
        page.click("#ask button")
        assert page.locator("#detail a[href^=javascript]").count() == 0
    for key in page.locator("#up option").evaluate_all("options => options.map(o => o.value)"):
        page.select_option("#up", key)
    for group in page.locator("#which option").evaluate_all("options => options.map(o => o.value)"):
        page.select_option("#which", group)
    assert page.evaluate("document.body.dataset.harmed") is None
    assert page.locator("main script, section script, #detail img").count() == 0
    assert "<script>" in page.locator("#choose").inner_text()
    assert found.complaints == [] and len(found.asked) == 1
    page.close()


@pytest.mark.heavy
@pytest.mark.parametrize("kind", ["none meets", "no limits", "all failed", "one", "nothing ran", "sample", "few"])
def test_every_kind_of_study(browser: Any, samples: ModuleType, tmp_path: Path, kind: str) -> None:
    grid = samples.grid()
    data = {
        "none meets": samples.grid({"deflection": 0.05}), "no limits": samples.grid({}),
        "all failed": dataclasses.replace(grid, rows=tuple(r for r in grid.rows if r.outcome.status == "failed")),
        "one": dataclasses.replace(grid, rows=grid.rows[:1]),
        "nothing ran": dataclasses.replace(grid, rows=tuple(dataclasses.replace(r, outcome=None, aim=None)
                                                            for r in grid.rows)),
        "sample": samples.sampled(64), "few": dataclasses.replace(grid, rows=grid.rows[:2]),
    }[kind]
    found = opened(browser, tmp_path, data)
    assert found.complaints == [] and len(found.asked) == 1
    assert found.page.evaluate("document.documentElement.scrollWidth") <= 1280
    assert found.page.pdf().startswith(b"%PDF")
    found.page.close()


@pytest.mark.heavy
def test_ten_thousand_variants_can_be_used(browser: Any, samples: ModuleType, tmp_path: Path) -> None:
    """Seconds of the browser's own work, to a sheet that is sorted anew and a trade-off that is drawn anew."""
    found = opened(browser, tmp_path, samples.sampled(10_000))
    page = found.page
    spent = page.evaluate("""() => {
        const begin = performance.now();
        document.querySelector('#table th[data-key="figure:stress"] button').click();
        return performance.now() - begin; }""")
    assert spent < 1500
    values = [float(text) for text in column(page, "figure:stress")]
    assert values == sorted(values) and len(values) == 25
    page.select_option("#up", "stress")
    assert len(drawn(page, "best front")) > 3
    page.fill("#wanted", "9999")
    page.click("#ask button")
    assert page.locator("#detail").inner_text().startswith("Variant 9999")
    assert found.complaints == []
    page.close()
