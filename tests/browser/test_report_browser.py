"""The review page in a real browser: Chromium, headless, without a network.

Skipped where Chromium or playwright is missing: `apt-get install chromium`, `pip install axe-playwright-python`. The
accessibility rules are those of axe-core, which that package ships.
"""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1]))

import report_samples as samples

from optopick.report.page import page
from optopick.report.words import amount, standing

CHROMIUM = os.environ.get("CHROMIUM") or shutil.which("chromium") or shutil.which("chromium-browser")
if CHROMIUM is None:
    pytest.skip("Chromium is not installed (Debian: apt-get install chromium)", allow_module_level=True)
sync_api = pytest.importorskip("playwright.sync_api", reason="playwright is not installed (pip install playwright)")
axe_package = pytest.importorskip("axe_playwright_python", reason="axe-playwright-python is not installed")

FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
WIDTHS = (390, 820, 1280)
AXE = (Path(axe_package.__file__).parent / "axe.min.js").read_text(encoding="utf-8")
DOCUMENTS = {
    "full": samples.full,
    "plain": samples.plain,
    "given": samples.given,
    "nothing found": samples.nothing_found,
}


@pytest.fixture(scope="session")
def files(tmp_path_factory) -> dict[str, Path]:
    """The pages as files."""
    folder = tmp_path_factory.mktemp("pages")
    made = {}
    for name, document in DOCUMENTS.items():
        made[name] = folder / f"{name.replace(' ', '-')}.html"
        made[name].write_text(page(document()), encoding="utf-8")
    return made


class Shown:
    """A page that is open, what it said on the console and what it asked for."""

    def __init__(self, browser, path: Path, width: int = 1280, **context) -> None:
        self.context = browser.new_context(viewport={"width": width, "height": 900}, **context)
        self.page = self.context.new_page()
        self.said: list[str] = []
        self.asked: list[str] = []
        self.page.on("console", lambda message: self.said.append(message.text))
        self.page.on("pageerror", lambda error: self.said.append(str(error)))
        self.page.on("request", lambda request: self.asked.append(request.url))
        self.page.goto(path.as_uri())

    def __enter__(self) -> Shown:
        return self

    def __exit__(self, *_) -> None:
        self.context.close()

    def text(self, part: str) -> str:
        return self.page.locator(f'[data-part="{part}"]').inner_text()


@pytest.fixture
def show(browser, files):
    """Opens a page by its document's name."""
    return lambda name, **context: Shown(browser, files[name], **context)


every_document = pytest.mark.parametrize("name", DOCUMENTS)


@every_document
def test_quiet_and_alone(show, files, name):
    """Nothing on the console, and nothing asked for but the file itself (and the empty icon within it)."""
    with show(name) as shown:
        shown.page.wait_for_load_state("networkidle")
        assert shown.said == []
        assert [url for url in shown.asked if url != "data:,"] == [files[name].as_uri()]


def test_a_fetch_would_be_seen(browser, tmp_path):
    """The test's own eyes: a page that asks for something is caught asking."""
    path = tmp_path / "asks.html"
    path.write_text('<!DOCTYPE html><title>x</title><img src="missing.png"><script>undefined.x</script>')
    with Shown(browser, path) as shown:
        shown.page.wait_for_load_state("networkidle")
        assert any(url.endswith("missing.png") for url in shown.asked)
        assert any("undefined" in said for said in shown.said)


OVERFLOWING = """() => {
  const wide = document.documentElement.clientWidth;
  return [...document.querySelectorAll("body *")]
    .filter((one) => one.getClientRects().length && !one.closest(".scroll") && !one.closest(".skip"))
    .filter((one) => one.getBoundingClientRect().right > wide + 0.5 || one.getBoundingClientRect().left < -0.5)
    .map((one) => `${one.tagName} ${one.textContent.slice(0, 60)}`);
}"""


@every_document
@pytest.mark.parametrize("width", WIDTHS)
def test_no_overflow(show, name, width):
    """No element reaches beyond the window's sides, and the page cannot be scrolled sideways."""
    with show(name, width=width) as shown:
        shown.page.evaluate("for (const one of document.querySelectorAll('details')) one.open = true")
        assert shown.page.evaluate("document.documentElement.scrollWidth") == width
        assert shown.page.evaluate(OVERFLOWING) == []


TEXT_OUTSIDE = """() => [...document.querySelectorAll("svg.plot, svg.schematic")].flatMap((picture) => {
  const frame = (picture.matches(".plot") ? picture.parentElement : picture).getBoundingClientRect();
  const texts = [...picture.querySelectorAll("text")].map((text) => [text.textContent, text.getBoundingClientRect()]);
  const outside = texts.filter(([, box]) => box.width && (box.left < frame.left - 1 || box.right > frame.right + 1));
  return outside.map(([words]) => words);
})"""

TEXT_OVERLAPS = """() => [...document.querySelectorAll("svg.plot, svg.schematic")].flatMap((picture) => {
  const boxes = [...picture.querySelectorAll("text")].map((text) => [text.textContent, text.getBoundingClientRect()]);
  const shared = (a, b) => Math.min(a.right, b.right) - Math.max(a.left, b.left) > 2
    && Math.min(a.bottom, b.bottom) - Math.max(a.top, b.top) > 4;
  return boxes.flatMap(([words, box], k) => boxes.slice(k + 1)
    .filter(([, other]) => box.width && other.width && shared(box, other)).map(([other]) => `${words} / ${other}`));
})"""


@pytest.mark.parametrize("width", WIDTHS)
def test_words_in_pictures_are_whole_and_apart(show, width):
    """No text of a picture is cut off at its sides or lies on another."""
    with show("full", width=width) as shown:
        assert shown.page.evaluate(TEXT_OUTSIDE) == []
        assert shown.page.evaluate(TEXT_OVERLAPS) == []


def violations(shown: Shown) -> list[str]:
    """What axe-core finds, WCAG 2.1 A and AA and its own best practices."""
    shown.page.evaluate(AXE)
    found = shown.page.evaluate("axe.run(document, {resultTypes: ['violations']})")
    return [f"{one['id']}: {node['html'][:120]}" for one in found["violations"] for node in one["nodes"]]


@every_document
@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [390, 1280])
def test_accessible(browser, files, name, scheme, width):
    with Shown(browser, files[name], width, color_scheme=scheme, bypass_csp=True) as shown:
        assert violations(shown) == []


def test_axe_sees_faults(browser, tmp_path):
    """The test's own eyes: grey on grey and an image without words are found."""
    path = tmp_path / "faulty.html"
    faults = '<p style="color:#999;background:#bbb">grey on grey</p><img src="data:,">'
    path.write_text(f'<!DOCTYPE html><html lang="en"><title>x</title>{faults}')
    with Shown(browser, path) as shown:
        found = {violation.partition(":")[0] for violation in violations(shown)}
    assert {"color-contrast", "image-alt"} <= found


def test_dark_and_light_differ(show):
    grounds = []
    for scheme in ("light", "dark"):
        with show("plain", color_scheme=scheme) as shown:
            grounds.append(shown.page.evaluate("getComputedStyle(document.body).backgroundColor"))
    assert grounds == ["rgb(252, 251, 248)", "rgb(18, 24, 26)"]


# ---- keyboard ---------------------------------------------------------------------------------------------------


def test_skip_link(show):
    """The first stop of the tabulator leads past the contents."""
    with show("plain") as shown:
        shown.page.keyboard.press("Tab")
        assert shown.page.evaluate("document.activeElement.textContent") == "To the content"
        assert shown.page.evaluate("document.activeElement.getBoundingClientRect().left") >= 0
        shown.page.keyboard.press("Enter")
        assert shown.page.evaluate("document.activeElement.id") == "content"


def reach(shown: Shown, selector: str) -> None:
    """Press Tab until an element has the focus."""
    for _ in range(200):
        shown.page.keyboard.press("Tab")
        if shown.page.evaluate(f"document.activeElement.matches('{selector}')"):
            return
    raise AssertionError(f"{selector} cannot be reached by Tab")


def test_explorer_by_keyboard(show):
    """Radio buttons, slider, and buttons by Tab, arrows, Home, End and Enter; the page shows the point each time."""
    walks = samples.full().walks
    with show("full") as shown:
        reach(shown, "input[name=walk]")
        reach(shown, "#explorer-slider")
        loads = walks[0].points
        assert shown.text("now").startswith(f"10 kΩ (this design): {standing(loads[2])}")
        shown.page.keyboard.press("ArrowRight")
        assert shown.text("now") == f"15 kΩ: {standing(loads[3])}"
        assert amount(loads[3].timing.delay_off, "s") in shown.text("times")
        shown.page.keyboard.press("Home")
        assert shown.text("now") == f"4.7 kΩ: {standing(loads[0])}"
        shown.page.keyboard.press("End")
        assert shown.text("now") == f"22 kΩ: {standing(loads[4])}"
        assert shown.page.get_attribute("#explorer-slider", "aria-valuetext") == "22 kΩ"
        reach(shown, "[data-part=before]")
        shown.page.keyboard.press("Enter")
        assert shown.text("now") == f"15 kΩ: {standing(loads[3])}"
        reach(shown, "[data-part=back]")
        shown.page.keyboard.press("Space")
        assert shown.text("now").startswith("10 kΩ (this design)")
        assert shown.said == []


def test_explorer_changes_walk_by_keyboard(show):
    walks = samples.full().walks
    with show("full") as shown:
        reach(shown, "input[name=walk]")
        shown.page.keyboard.press("ArrowDown")
        assert shown.text("now").startswith(f"220 kΩ (this design): {standing(walks[1].points[1])}")
        assert shown.text("label") == "Base-emitter resistor"
        shown.page.keyboard.press("ArrowDown")
        assert shown.text("now").endswith(standing(walks[2].points[0]))
        assert not shown.page.is_visible("[data-part=back]")


def test_explorer_shows_the_checks_and_moves_the_cursor(show):
    """Rows as many as checks, words as the review's, and the line on the plot over the value shown."""
    found = samples.full().walks[0].points
    with show("full") as shown:
        cursor = shown.page.locator('[data-walk="r-load"] .cursor')
        for k in (2, 3):
            rows = shown.page.locator('[data-part="checks"] tr')
            assert rows.count() == len(found[k].checks)
            assert amount(found[k].checks[0].value, found[k].checks[0].unit) in rows.nth(0).inner_text()
            before = float(cursor.get_attribute("x1").rstrip("%"))
            shown.page.get_by_role("button", name="Next").click()
        assert float(cursor.get_attribute("x1").rstrip("%")) > before
        shown.page.get_by_role("radio", name="Base-emitter resistor").check()
        shown.page.locator("#explorer-slider").press("End")
        assert shown.text("now").startswith("none: ")
        assert not shown.page.locator('[data-walk="r-be"] .cursor').is_visible()


def test_only_the_walk_that_is_chosen_is_shown(show):
    with show("full") as shown:
        visible = [name for name in ("r-load", "r-be") if shown.page.is_visible(f'[data-walk="{name}"] figure')]
        assert visible == ["r-load"]
        assert shown.page.locator("details.walk[open]").count() == 0


def test_without_script_a_table(show):
    """All walks with plot and open table; the controls that would do nothing stay hidden."""
    with show("full", java_script_enabled=False) as shown:
        assert not shown.page.is_visible("#explorer-panel")
        assert not shown.page.is_visible("#explorer-results")
        for walk in samples.full().walks:
            table = shown.page.locator(f'details[data-walk="{walk.position.replace("_", "-")}"] tbody tr')
            assert table.count() == len(walk.points)
            assert table.nth(0).is_visible()
            assert standing(walk.points[0]) in table.nth(0).inner_text()


# ---- paper ------------------------------------------------------------------------------------------------------


def pdf_words(path: Path) -> list[str]:
    """Words of each page, with their places, by poppler: x from, x to, page width."""
    run = subprocess.run(["pdftotext", "-bbox", str(path), "-"], capture_output=True, text=True, check=True)
    return run.stdout.split("<page ")[1:]


@pytest.mark.skipif(shutil.which("pdftotext") is None, reason="pdftotext is missing (Debian: poppler-utils)")
@pytest.mark.parametrize(("paper", "width"), [("A4", 595), ("Letter", 612)])
def test_print_is_not_cut(show, tmp_path, paper, width):
    """Every word lies on its page within the margins; the brief is printed in full, the controls are not."""
    path = tmp_path / "page.pdf"
    with show("full") as shown:
        shown.page.pdf(path=str(path), format=paper)
    pages = pdf_words(path)
    assert len(pages) > 3
    said = []
    for text in pages:
        assert float(re.search(r'width="([\d.]+)"', text)[1]) == pytest.approx(width, abs=1)
        for left, right, word in re.findall(r'<word xMin="([-\d.]+)".*?xMax="([-\d.]+)".*?>(.*?)</word>', text):
            assert float(left) >= 36, word
            assert float(right) <= width - 36, word
            said.append(word)
    printed = " ".join(said)
    assert "title = &apos;Invented link&apos;" in printed or "title = 'Invented link'" in printed
    assert "Previous" not in printed
    for plot in ("R_load", "R_BE"):
        assert f"{plot} →" in printed
    assert not any(pages_without_words(pages))


def pages_without_words(pages: list[str]) -> list[bool]:
    return ["<word" not in text for text in pages]
