"""The page of a board in a real browser, held to what the page of a link is held to."""

from __future__ import annotations

import re
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1]))
sys.path.insert(0, str(Path(__file__).parent))

import board_samples as samples
from test_report_browser import OVERFLOWING, WIDTHS, Shown, pdf_words, shutil, violations

from optopick.report.board_page import alike, board_page
from optopick.report.labels import check_label

every_document = pytest.mark.parametrize("name", samples.DOCUMENTS)


@pytest.fixture(scope="session")
def pages(tmp_path_factory) -> dict[str, Path]:
    """The pages as files."""
    folder = tmp_path_factory.mktemp("boards")
    made = {}
    for name, document in samples.DOCUMENTS.items():
        made[name] = folder / f"{name}.html"
        made[name].write_text(board_page(document()), encoding="utf-8")
    return made


@every_document
def test_quiet_and_alone(browser, pages, name):
    """Nothing on the console, and nothing asked for but the file itself (and the empty icon within it)."""
    with Shown(browser, pages[name]) as shown:
        shown.page.wait_for_load_state("networkidle")
        assert shown.said == []
        assert [url for url in shown.asked if url != "data:,"] == [pages[name].as_uri()]


@every_document
@pytest.mark.parametrize("width", WIDTHS)
def test_no_overflow(browser, pages, name, width):
    """No element reaches beyond the window's sides, and the page cannot be scrolled sideways."""
    with Shown(browser, pages[name], width) as shown:
        shown.page.evaluate("for (const one of document.querySelectorAll('details')) one.open = true")
        assert shown.page.evaluate("document.documentElement.scrollWidth") == width
        assert shown.page.evaluate(OVERFLOWING) == []


@every_document
@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [390, 1280])
def test_accessible(browser, pages, name, scheme, width):
    """Opened in full too, for what is folded away is not looked at."""
    with Shown(browser, pages[name], width, color_scheme=scheme, bypass_csp=True) as shown:
        assert violations(shown) == []
        shown.page.evaluate("for (const one of document.querySelectorAll('details')) one.open = true")
        assert violations(shown) == []


def test_checks_open_by_keyboard(browser, pages):
    """The tightest checks are there at once, all of them after Enter on their summary."""
    with Shown(browser, pages["full"]) as shown:
        part = shown.page.locator(".of-links").first
        rows = part.locator("tr[data-check]")
        assert [rows.nth(k).is_visible() for k in (0, 1, 2, 3)] == [True, True, True, False]
        part.locator("summary").focus()
        shown.page.keyboard.press("Enter")
        assert all(rows.nth(k).is_visible() for k in range(rows.count()))


@pytest.mark.skipif(shutil.which("pdftotext") is None, reason="pdftotext is missing (Debian: poppler-utils)")
def test_on_paper_every_check_is_there(browser, pages, tmp_path):
    """Nothing is cut at the sides, and what is folded on the screen is printed: every check, and the briefs."""
    path = tmp_path / "page.pdf"
    with Shown(browser, pages["full"]) as shown:
        shown.page.pdf(path=str(path), format="A4")
    printed = "".join(pdf_words(path))
    for left, right, word in re.findall(r'<word xMin="([-\d.]+)".*?xMax="([-\d.]+)".*?>(.*?)</word>', printed):
        assert float(left) >= 36, word
        assert float(right) <= 595 - 36, word
    told = alike(samples.full().result)
    for name in {check.name for one in told for check in one.review.checks}:
        word = check_label(name).split()[0]
        rows = [
            check
            for one in told
            for check in (*one.tight, *one.review.checks)
            if check_label(check.name).split()[0] == word
        ]
        assert printed.count(f">{word}<") >= len(rows), word
    assert ">[stock]<" in printed
