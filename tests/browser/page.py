"""Opens a published page from disk in a headless Chromium, does what a reader does, and holds what the page then says against
what the library computes.

    python3 page.py PAGE EXPECTED [SCREENSHOTS]

EXPECTED is JSON made by `cargo test --test publish`: suites, each with limits, a budget and the counts and choices that the
library finds for them. Needs playwright from PyPI and a Chromium: of Debian, or the one in CHROMIUM.
"""

import json
import os
import pathlib
import sys

from playwright.sync_api import sync_playwright

page_file, expected_file = map(pathlib.Path, sys.argv[1:3])
pictures = pathlib.Path(sys.argv[3]) if len(sys.argv) > 3 else None
expected = json.loads(expected_file.read_text())
failures = []


def check(holds, what):
    if not holds:
        failures.append(what)
        print(f"FAILED: {what}")


def counts(suite):
    """Method label to counts of trusted, rejected and undecided, in the order of rows."""
    rows = suite.locator(".ranking tbody tr").all()
    found = []
    for row in rows:
        cell = lambda name: int(row.locator("." + name).inner_text().split("(")[1].rstrip(")"))
        found.append([int(row.get_attribute("data-entrant")), cell("trusted"), cell("rejected"), cell("undecided")])
    return found


def choices(suite):
    found = []
    for table in suite.locator("table.map").all():
        cells = table.locator("td[data-cell]").all()
        cells.sort(key=lambda td: int(td.get_attribute("data-cell")))
        found.append([td.inner_text().split() for td in cells])
    return found


def explore(page):
    page.goto(page_file.resolve().as_uri())
    for s, asked in enumerate(expected["suites"]):
        suite = page.locator(f"#suite-{s}")
        for trial in asked["trials"]:
            suite.get_by_role("button", name="Back to the suite's own").click()
            for key, value in trial["limits"].items():
                suite.locator(f'[data-limit="{key}"]').fill(repr(value))
            budget = trial["budget"]
            if budget["evaluations"] is not None:
                suite.locator('[data-budget="evaluations"]').fill(str(budget["evaluations"]))
            if budget["no_derivatives"]:
                suite.locator('[data-budget="derivatives"]').uncheck()
            check(counts(suite) == trial["counts"], f"counts of suite {s}: {trial['name']}: {counts(suite)} and not {trial['counts']}")
            check(choices(suite) == trial["choices"], f"choices of suite {s}: {trial['name']}")
        suite.get_by_role("button", name="Back to the suite's own").click()
        # A slider moves its number and with it the shares.
        before = counts(suite)
        slider = suite.locator('[data-slider="nees_ratio_high"]')
        slider.focus()
        page.keyboard.press("End")
        check(counts(suite) != before, f"suite {s}: the slider changes nothing")
        suite.get_by_role("button", name="Back to the suite's own").click()
        check(counts(suite) == before, f"suite {s}: the way back does not lead back")
        sort(suite, s)
        choose(page, suite, s)


def sort(suite, s):
    heading = suite.locator(".cases thead button", has_text="Excess")
    column = 10
    values = lambda: [float(td.inner_text().split(" ")[0]) for td in suite.locator(f".cases tbody tr > :nth-child({column + 1})").all() if td.inner_text()[0] not in "–"]
    heading.focus()
    heading.press("Enter")
    check(values() == sorted(values()), f"suite {s}: not sorted upwards: {values()[:5]}")
    heading.press("Enter")
    check(values() == sorted(values(), reverse=True), f"suite {s}: not sorted downwards")
    check(suite.locator('.cases th[aria-sort="descending"]').count() == 1, f"suite {s}: the sorted column is not said")
    suite.locator('[data-filter="verdict"]').select_option("trusted")
    words = set(suite.locator(".cases tbody .word").all_inner_texts())
    check(words <= {"trusted"}, f"suite {s}: the filter lets {words} through")
    suite.locator('[data-filter="verdict"]').select_option("")


def choose(page, suite, s):
    cells = suite.locator("table.map button").all()
    if not cells:
        return
    cells[0].click()
    detail = suite.locator(".detail")
    check(detail.is_visible() and detail.locator("tbody tr").count() > 0, f"suite {s}: a click on the map shows no numbers")
    page.keyboard.press("ArrowRight")
    page.keyboard.press("Enter")
    pressed = suite.locator('table.map button[aria-pressed="true"]')
    check(pressed.count() == 1, f"suite {s}: {pressed.count()} cells are pressed")
    if suite.locator("table.map").first.locator("tbody tr").first.locator("button").count() > 1:
        check(pressed.first.get_attribute("aria-label") == cells[1].get_attribute("aria-label"), f"suite {s}: arrow keys do not walk")


def labelled(page):
    """Everything that can be operated has a name, every picture a text, every id is there once."""
    found = page.evaluate(
        """() => {
          const bad = [];
          for (const node of document.querySelectorAll('input, select')) {
            if (!(node.labels && node.labels.length) && !node.getAttribute('aria-label')) bad.push('without label: ' + node.outerHTML.slice(0, 80));
          }
          for (const node of document.querySelectorAll('button')) {
            if (!node.textContent.trim() && !node.getAttribute('aria-label')) bad.push('without name: ' + node.outerHTML.slice(0, 80));
          }
          for (const node of document.querySelectorAll('img')) if (!node.alt) bad.push('without alt: ' + node.src.slice(0, 40));
          const ids = [...document.querySelectorAll('[id]')].map((node) => node.id);
          for (const id of new Set(ids)) if (ids.filter((i) => i === id).length > 1) bad.push('twice: #' + id);
          for (const node of document.querySelectorAll('[aria-labelledby]')) if (!document.getElementById(node.getAttribute('aria-labelledby'))) bad.push('label missing: ' + node.getAttribute('aria-labelledby'));
          return bad;
        }"""
    )
    check(found == [], f"labels: {found[:5]}")
    wide = page.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
    check(wide <= 0, f"the page is {wide} pixels wider than the window")


with sync_playwright() as playwright:
    browser = playwright.chromium.launch(executable_path=os.environ.get("CHROMIUM", "/usr/bin/chromium"), args=["--no-sandbox"])
    for name, width, scheme in [("desktop", 1280, "light"), ("phone", 390, "dark")]:
        page = browser.new_page(viewport={"width": width, "height": 900}, color_scheme=scheme)
        messages = []
        page.on("console", lambda message: messages.append(message.text))
        page.on("pageerror", lambda error: messages.append(str(error)))
        page.on("request", lambda request: messages.append("asks for " + request.url) if not request.url.startswith(("file:", "data:")) else None)
        explore(page)
        labelled(page)
        if expected.get("foreign"):
            check(page.locator("[data-foreign]").count() == 0, "foreign markup came alive")
            check(expected["foreign"] in page.locator("body").inner_text(), "a foreign title does not show as text")
        check(messages == [], f"{name}: console: {messages[:3]}")
        if pictures:
            pictures.mkdir(parents=True, exist_ok=True)
            page.screenshot(path=pictures / f"{name}.png", full_page=True)
            page.evaluate("document.querySelector('.controls').scrollIntoView()")
            page.screenshot(path=pictures / f"{name}-controls.png")
            page.evaluate("document.querySelector('.detail').scrollIntoView()")
            page.screenshot(path=pictures / f"{name}-detail.png")
            page.evaluate("document.querySelector('.map').scrollIntoView()")
            page.screenshot(path=pictures / f"{name}-map.png")
            if name == "desktop":
                page.pdf(path=pictures / "print.pdf")
        page.close()
    browser.close()

print("failed" if failures else "the page says what the library computes")
sys.exit(1 if failures else 0)
