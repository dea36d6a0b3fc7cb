"""Pages and figures as pictures, to be looked at: ``python tests/benchmarks/render.py FOLDER RESULT.h5 ...``

Writes each result's sheet into FOLDER, as HTML and as the program's own PDF, and prints seconds and sizes; with a
Chromium (``--browser PATH``) the page as it looks on a screen and as it prints, with ``--figures`` every figure and the
moving profile as well, and with ``pdftoppm`` the pages of the PDFs.  The program and its tests need none of these.
"""

from __future__ import annotations

import argparse
import shutil
import subprocess
import time
from pathlib import Path
from typing import Any

from transient.result.result import Result, ResultError
from transient.sheet.document.write import write_sheet
from transient.sheet.figures import FIGURES, SWEEP_FIGURES, draw, save
from transient.sheet.moving import write_moving
from transient.sweep.table import read

WIDE, TALL = 820, 12000
MOMENT = 3000  # ms of the moving picture's round at which it is looked at
QUIET: dict[str, Any] = {"stdout": subprocess.DEVNULL, "stderr": subprocess.DEVNULL, "check": True, "timeout": 120}


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
        for ending in (".html", ".pdf"):
            target = asked.folder / f"{path.stem}{ending}"
            began = time.perf_counter()
            write_sheet(result, target, path.name)
            seconds = time.perf_counter() - began
            print(f"{target.name:32} {target.stat().st_size / 1e3:7.0f} kB in {seconds:5.2f} s")
        pages(asked.folder / f"{path.stem}.pdf")
        if asked.browser:
            photograph(asked.browser, asked.folder / f"{path.stem}.html")
        if asked.figures:
            pictures(result, asked.folder, path.stem, asked.browser)


def pictures(result: Result, folder: Path, stem: str, browser: str | None) -> None:
    """Every figure that the result has the histories for, and the moving profile."""
    many = "case" in result.variables
    for name in SWEEP_FIGURES if many else FIGURES:
        try:
            save(draw(result, name), folder / f"{stem}_{name}.png")
        except ResultError as error:
            print(f"  {error}")
    if many:
        return
    moving = folder / f"{stem}_moving.html"
    write_moving(result, moving)
    if browser:
        look = [*usual(browser), "--window-size=880,700", f"--virtual-time-budget={MOMENT}"]
        subprocess.run([*look, f"--screenshot={moving.with_suffix('.png')}", moving.resolve().as_uri()], **QUIET)


def photograph(browser: str, page: Path) -> None:
    """The page on a screen and on paper."""
    screen, paper = page.with_suffix(".screen.png"), page.with_suffix(".paper.pdf")
    address = page.resolve().as_uri()
    subprocess.run([*usual(browser), f"--window-size={WIDE},{TALL}", f"--screenshot={screen}", address], **QUIET)
    subprocess.run([*usual(browser), "--no-pdf-header-footer", f"--print-to-pdf={paper}", address], **QUIET)
    pages(paper)


def pages(paper: Path) -> None:
    """Each page of a PDF as a picture."""
    if shutil.which("pdftoppm"):
        subprocess.run(["pdftoppm", "-r", "75", "-png", str(paper), str(paper.with_suffix(""))], **QUIET)


def usual(browser: str) -> list[str]:
    """A browser without a screen."""
    return [browser, "--headless", "--no-sandbox", "--disable-gpu", "--hide-scrollbars"]


if __name__ == "__main__":
    main()
