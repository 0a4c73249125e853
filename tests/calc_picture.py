"""The README's picture: the Kestrel Quay workbook in a real Calc, recalculated after a span was changed.

`python tests/calc_picture.py` draws it anew; look at it before it is kept.
"""

from __future__ import annotations

import re
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

import pytest
from calc_office import CalcOffice, running
from PIL import Image, ImageChops
from PIL.PngImagePlugin import PngInfo

WORKBOOKS = Path(__file__).parent.parent / "workbooks"
PICTURE = WORKBOOKS / "pictures" / "kestrel_quay_in_calc.png"
SHEET, PAGE = "Runway", 3
SPAN, BEFORE, AFTER = "K7", 5.4, 7.2
"""The cell of the last span, its length in the workbook, and what it is changed to."""
MARKED = 0xFFB347
"""The ground that the changed cell is given."""

PDF = "calc_pdf_Export"
DOTS, MILLIMETRES = 115, 25.4
"""The dots of an inch, and how long it is."""
LEFT, TOP, WIDTH, HEIGHT = 11, 12, 397, 264
"""The part of the page that is shown, in millimetres: all but margins, header and footer."""
COLOURS = 64
COARSE = 8
"""The picture's dots in a row that are compared as one."""
DRAWN_BY = "Software"


@dataclass(frozen=True)
class Page:
    """The page as the office prints it: the picture, its texts, and the program and fonts that it was drawn with."""

    image: Image.Image
    text: str
    drawn_by: str

    def keep(self, path: Path) -> None:
        """Write the picture to a file."""
        told = PngInfo()
        told.add_text(DRAWN_BY, self.drawn_by)
        self.image.save(path, optimize=True, pnginfo=told)


@contextmanager
def workbook(calc: CalcOffice, folder: Path) -> Iterator[int]:
    """A copy of the example workbook, open in Calc."""
    book = calc.open(shutil.copy(WORKBOOKS / "kestrel_quay.xlsx", folder))
    yield book
    calc.close(book)


def change(calc: CalcOffice, book: int) -> None:
    """Type another length into the cell of the span; mark the cell."""
    calc.enter(book, {SPAN: AFTER}, SHEET)
    calc.paint(book, SPAN, MARKED, SHEET)


def page(calc: CalcOffice, book: int, folder: Path) -> Page:
    """Print the workbook, and draw the page."""
    if shutil.which("pdftoppm") is None:
        pytest.skip("not run: pdftoppm is not installed (Debian: poppler-utils)")
    pdf, picture = folder / "book.pdf", folder / "page"
    calc.export(book, pdf, PDF)
    x, y, width, height = (round(size * DOTS / MILLIMETRES) for size in (LEFT, TOP, WIDTH, HEIGHT))
    part = [f"-{name}={size}" for name, size in zip("xyWH", (x, y, width, height), strict=True)]
    part = [word for one in part for word in one.split("=")]
    _told("pdftoppm", "-png", "-singlefile", "-r", str(DOTS), *part, *_only(PAGE), pdf, picture)
    with Image.open(picture.with_suffix(".png")) as drawn:
        image = drawn.convert("RGB").quantize(COLOURS, dither=Image.Dither.NONE)
    fonts = sorted(set(re.findall(r"^[A-Z]{6}\+(\S+)", _told("pdffonts", *_only(PAGE), pdf), re.MULTILINE)))
    program = re.findall(r"Producer: *(.*)", _told("pdfinfo", pdf))[0]
    return Page(image, _told("pdftotext", "-layout", *_only(PAGE), pdf, "-"), f"{program} with {', '.join(fonts)}")


def difference(one: Image.Image, other: Image.Image) -> float:
    """How far two pictures are apart where they are so most, seen from afar: 0 the same, 255 black for white."""
    if one.size != other.size:
        return 255.0
    seen = [
        image.convert("L").resize([size // COARSE for size in image.size], Image.Resampling.BOX)
        for image in (one, other)
    ]
    return float(ImageChops.difference(*seen).getextrema()[1])


def _only(number: int) -> tuple[str, ...]:
    return "-f", str(number), "-l", str(number)


def _told(*command: str | Path) -> str:
    return subprocess.run(list(map(str, command)), check=True, stdout=subprocess.PIPE, text=True).stdout


def main() -> None:
    """Draw the picture anew."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        with running(folder / "profile", folder / "server") as calc, workbook(calc, folder) as book:
            change(calc, book)
            PICTURE.parent.mkdir(exist_ok=True)
            page(calc, book, folder).keep(PICTURE)
    print(f"{PICTURE}: {PICTURE.stat().st_size} bytes")


if __name__ == "__main__":
    main()
