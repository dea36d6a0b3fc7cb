"""Pages and figures as pictures, to be looked at: ``python tests/benchmarks/render.py FOLDER RESULT.h5 ...``

Writes each result's sheet (HTML, print form through a headless browser as PDF and PNG, the program's own PDF) and every
figure as PNG into FOLDER, and prints seconds and sizes.  Needs a Chromium (``--browser PATH``) and, for the printed
pages, ``pdftoppm``; neither is needed by the program or its tests.
"""

from __future__ import annotations

import argparse
import shutil
import subprocess
import time
from pathlib import Path

from transient.result.result import Result, ResultError
from transient.result.store import read
from transient.sheet.document.page import facts_of, html
from transient.sheet.figures import FIGURES, draw, save

WIDE, TALL = 820, 12000


def main() -> None:
    """Command line."""
    words = argparse.ArgumentParser(description=__doc__)
    words.add_argument("folder", type=Path)
    words.add_argument("results", type=Path, nargs="+")
    words.add_argument("--browser", default=shutil.which("chromium") or shutil.which("google-chrome"))
    words.add_argument("--figures", action="store_true", help="every figure as well")
    asked = words.parse_args()
    asked.folder.mkdir(parents=True, exist_ok=True)
    for path in asked.results:
        result = read(path)
        page = asked.folder / f"{path.stem}.html"
        began = time.perf_counter()
        page.write_text(html(facts_of(result, path.name)), encoding="utf-8")
        seconds = time.perf_counter() - began
        print(f"{path.stem:24} page {page.stat().st_size / 1e3:7.0f} kB in {seconds:5.2f} s")
        if asked.figures:
            pictures(result, asked.folder, path.stem)
        if asked.browser:
            photograph(asked.browser, page)


def pictures(result: Result, folder: Path, stem: str) -> None:
    """Every figure that the result has the histories for."""
    for name in FIGURES:
        try:
            save(draw(result, name), folder / f"{stem}_{name}.png")
        except ResultError as error:
            print(f"  {error}")


def photograph(browser: str, page: Path) -> None:
    """The page on a screen and on paper."""
    usual = [browser, "--headless", "--no-sandbox", "--disable-gpu", "--hide-scrollbars"]
    screen, paper = page.with_suffix(".screen.png"), page.with_suffix(".paper.pdf")
    address = page.resolve().as_uri()
    quiet = {"stdout": subprocess.DEVNULL, "stderr": subprocess.DEVNULL, "check": True, "timeout": 120}
    subprocess.run([*usual, f"--window-size={WIDE},{TALL}", f"--screenshot={screen}", address], **quiet)
    subprocess.run([*usual, "--no-pdf-header-footer", f"--print-to-pdf={paper}", address], **quiet)
    if shutil.which("pdftoppm"):
        subprocess.run(["pdftoppm", "-r", "75", "-png", str(paper), str(paper.with_suffix(""))], **quiet)


if __name__ == "__main__":
    main()
