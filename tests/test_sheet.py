"""The calculation sheet: one content, HTML and PDF of it, hostile text, the same bytes each time, and its look."""

import io
import os
import re
import shutil
import subprocess
import sys
import unicodedata
from functools import cache
from html.parser import HTMLParser

import pytest

from torsionfe.output.pdf import legible, render_pdf
from torsionfe.output.sheet import (
    PAPERS,
    Beside,
    Cells,
    Facts,
    Lines,
    Picture,
    Sheet,
    SheetSection,
    figure_bytes,
    render_html,
    svg_pictures,
)
from torsionfe.text import printable

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
PDFTOPPM, PDFTOTEXT = shutil.which("pdftoppm"), shutil.which("pdftotext")
needs_chromium = pytest.mark.skipif(CHROMIUM is None, reason="no chromium here")
needs_poppler = pytest.mark.skipif(PDFTOPPM is None or PDFTOTEXT is None, reason="no poppler here")

HOSTILE = [
    "<script>alert(1)</script>",
    "</style></title></svg><img src=x onerror=alert(1)>",
    "\" onload='x' & &amp; <!-- --> ]]>",
    "{{ 7 * 7 }} {% raw %} ${x} #{y}",
    r"$\alpha_2$ \$ $$ \frac{1}{2} $\undefined{",
    "שלום עולם מרחבא",
    "سلام، لوله",
    "\u202egnitpurret\u202c \u2066x",
    "\U0001f4a9 \U0001f468\u200d\U0001f52c 中文 ☃",
    "a\nb\r\nc\td\x00\x1b[31m\x07",
    "W" * 300,
    "word " * 150,
    "e\u0301\u0302\u0303 \ufeff\ufffe",
    "",
]


def nothing(figure):
    pass


def dots(figure):
    ax = figure.add_subplot()
    ax.plot([0.0, 1.0], [2.0, 3.0], "o")
    ax.set_xlabel("x [mm]")


TONES = ("plain", "list", "warning", "caution")


def sheet(text="plain", paper="a4", rows=4):
    facts = Facts(tuple((f"{text} {k}", text) for k in range(rows)))
    return Sheet(
        title=f"Title {text}",
        marks=(f"Revision {text}",),
        sections=(
            SheetSection("", (facts, Lines((f"verdict {text}", text), "verdict"))),
            SheetSection(f"Picture {text}", (Beside((Picture("dots", f"caption {text}", dots),), (facts,), 0.4),)),
            SheetSection("Cells", (Cells((text, "number", text), tuple((text, str(k), text) for k in range(rows))),)),
            SheetSection("Lines", tuple(Lines((text, f"{text}!"), tone) for tone in TONES)),
        ),
        paper=paper,
        origin=f"torsionfe {text}",
    )


@cache
def drawn():
    return svg_pictures(sheet())


class Reading(HTMLParser):
    """Every element, attribute and text of a document."""

    def __init__(self, html):
        super().__init__(convert_charrefs=True)
        self.tags, self.attributes, self.texts, self.stack = set(), [], [], []
        self.feed(html)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.tags.add(tag)
        self.attributes += attrs
        self.stack.append(tag)
        if tag in ("meta", "img", "br", "link"):
            self.stack.pop()

    def handle_startendtag(self, tag, attrs):
        self.tags.add(tag)
        self.attributes += attrs

    def handle_endtag(self, tag):
        assert self.stack.pop() == tag, tag

    def handle_data(self, data):
        if self.stack and self.stack[-1] not in ("style",):
            self.texts.append(data)


PLAIN_TAGS = {
    "html", "head", "meta", "title", "style", "body", "main", "section", "h1", "h2", "table", "thead", "tbody", "tr",
    "th", "td", "bdi", "div", "p", "ul", "li", "figure", "figcaption",
}  # fmt: skip
SVG_TAGS = {"svg", "g", "path", "defs", "use", "clippath", "rect", "image", "style", "pattern"}


def pdf_text(data, order="-layout"):
    found = subprocess.run([PDFTOTEXT, order, "-", "-"], input=data, capture_output=True, check=True)
    return found.stdout.decode("utf-8")


def squeezed(text):
    """Return text without spaces and direction marks, in one normal form: lines may break anywhere."""
    return re.sub(r"[\s\u200e\u200f\u202a-\u202e\u2066-\u2069]", "", unicodedata.normalize("NFC", text))


# --- HTML ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("text", HOSTILE, ids=range(len(HOSTILE)))
def test_hostile_text_stays_text_in_html(text):
    html = render_html(sheet(text), drawn())
    found = Reading(html)
    assert found.tags <= PLAIN_TAGS | SVG_TAGS
    assert not [name for name, _ in found.attributes if name.startswith("on")]
    shown = printable(text)
    wanted = [f"{word} {shown}" for word in ("Title", "verdict", "caption", "Picture")]
    assert {*wanted, f"{shown} 3", f"{shown}!"} <= set(found.texts)
    assert "\x00" not in html
    assert "\u202e" not in html
    assert found.tags == Reading(render_html(sheet("plain"), drawn())).tags


def test_the_document_needs_nothing_else():
    html = render_html(sheet())
    found = Reading(html)
    links = [value for name, value in found.attributes if name in ("src", "href", "xlink:href", "action", "data")]
    assert links
    assert all(value.startswith(("#", "data:image/png")) for value in links)
    names = {value for name, value in found.attributes if name.startswith("xmlns")}
    assert set(re.findall(r"https?://[^\"'\s)]+", html)) <= names
    assert ("content", "default-src 'none'; style-src 'unsafe-inline'; img-src data:") in found.attributes
    assert "script" not in found.tags
    assert "@import" not in html
    assert "font-face" not in html


def test_ids_of_two_pictures_are_apart():
    two = Sheet("t", (), (SheetSection("", (Picture("one", "a", dots), Picture("two", "b", dots))),))
    html = render_html(two, dict.fromkeys(["one", "two"], drawn()["dots"]))
    ids = re.findall(r'\bid="([^"]+)"', html)
    assert len(ids) == len(set(ids))
    assert {name.split("-")[0] for name in ids} == {"one", "two"}
    for target in re.findall(r'(?:href="#|url\(#)([^")]+)', html):
        assert target in ids


def test_pictures_speak_to_screen_readers():
    found = Reading(render_html(sheet()))
    assert ("aria-label", "caption plain") in found.attributes
    assert ("role", "img") in found.attributes


# --- PDF ----------------------------------------------------------------------------------------------------


@needs_poppler
def test_hostile_text_stays_text_in_pdf():
    read = squeezed(pdf_text(hostile_pdf(), "-raw"))
    for k, text in enumerate(HOSTILE):
        shown = squeezed(legible(text))
        if any(unicodedata.bidirectional(sign) in ("R", "AL", "NSM") for sign in shown):
            # set from right to left, or joined: the letters are all there
            assert set(shown) <= set(unicodedata.normalize("NFKC", read))
            continue
        for place in ("fact", "cell", "line", "title", "caption"):
            assert f"{k}{place}{shown}" in read, text


@cache
def hostile_pdf():
    return render_pdf(all_hostile())


def all_hostile():
    """Return a sheet with every hostile text in every place."""
    numbered = list(enumerate(HOSTILE))
    return Sheet(
        title="".join(f"{k} title {text}\n" for k, text in numbered),
        marks=tuple(HOSTILE),
        sections=(
            *(SheetSection(f"{k} title {text}", (Lines((f"{k} line {text}",), "list"),)) for k, text in numbered),
            SheetSection("", (Facts(tuple((f"{k} fact {text}", text) for k, text in numbered)),)),
            SheetSection("", (Cells(("", "a"), tuple((f"{k} cell {text}", text) for k, text in numbered), words=2),)),
            SheetSection("", tuple(Picture(f"p{k}", f"{k} caption {text}", nothing, 0.02) for k, text in numbered)),
        ),
        origin="".join(HOSTILE),
    )


@needs_poppler
@pytest.mark.parametrize("paper", PAPERS)
def test_pages_have_their_size_head_and_number(paper):
    cells = Cells(("number", "square"), tuple((str(k), str(k * k)) for k in range(90)))
    data = render_pdf(Sheet("Squares", ("Revision B",), (SheetSection("All", (cells,)),), paper=paper))
    pages = pdf_text(data).split("\f")[:-1]
    assert len(pages) >= 2
    for k, page in enumerate(pages, 1):
        assert re.match(r"\s*Squares +Revision B\n", page)
        assert f"page {k} of {len(pages)}" in page
        assert re.search(r"number +square\n", page)  # the table's head is repeated
    assert re.findall(r"^ *(\d+) +(\d+)$", "".join(pages), re.MULTILINE) == [(str(k), str(k * k)) for k in range(90)]
    box = re.search(rb"/MediaBox \[\s*0 0 ([\d.]+) ([\d.]+)", data)
    assert [float(side) / 72.0 for side in box.groups()] == pytest.approx(PAPERS[paper], abs=1e-3)


def test_what_the_font_lacks_is_written_as_its_number():
    assert legible("中\U0001f4a9τ") == "[U+4E2D][U+1F4A9]τ"
    assert legible("a\nb") == "a\nb"


def test_a_long_sheet_is_set_smaller_before_it_takes_a_fourth_page():
    from torsionfe.output import pdf

    def pages(rows):
        return len(pdf._set(sheet(rows=rows)))

    assert pages(4) == 1
    assert pages(50) == 3
    assert pages(80) > 3


def test_nothing_leaves_its_page():
    """Every text lies within the paper, and no two lines of one column touch."""
    from torsionfe.output import pdf

    for text in HOSTILE:
        for width in (80.0, 300.0):
            for line in pdf._wrapped(text, width, 8.0):
                assert pdf._width(line, 8.0) <= width + 1e-6 or len(line) == 1


# --- the same each time -------------------------------------------------------------------------------------

AGAIN = """
import hashlib, sys
sys.path.insert(0, sys.argv[1])
from test_sheet import sheet, render_html, render_pdf
data = render_html(sheet("x $y$ \\u05d0")).encode() + render_pdf(sheet("x $y$ \\u05d0"))
print(hashlib.sha256(data).hexdigest())
"""


def test_the_same_bytes_in_another_process():
    command = [sys.executable, "-c", AGAIN, os.path.dirname(__file__)]
    seeds = [{**os.environ, "PYTHONHASHSEED": seed, "SOURCE_DATE_EPOCH": seed} for seed in ("1", "2")]
    runs = [subprocess.Popen(command, env=seed, stdout=subprocess.PIPE, text=True) for seed in seeds]
    first, second = (run.communicate()[0] for run in runs)
    assert re.fullmatch(r"[0-9a-f]{64}\n", first)
    assert first == second


def test_the_users_own_settings_change_nothing():
    import matplotlib

    before = drawn()
    loud = {"font.size": 30, "figure.facecolor": "black", "text.color": "red", "font.family": "serif"}
    with matplotlib.rc_context(loud):
        assert svg_pictures(sheet()) == before


@pytest.mark.parametrize("ending", ["svg", "pdf", "png"])
def test_figures_of_their_own_are_the_same_each_time(ending):
    picture = Picture("dots", "", dots)
    data = figure_bytes(picture, 3.0, ending)
    assert data == figure_bytes(picture, 3.0, ending)
    if ending == "png":
        from matplotlib.image import imread

        assert imread(io.BytesIO(data)).shape[:2] == (675, 900)  # 300 dots an inch


# --- looked at ----------------------------------------------------------------------------------------------


def ink(path):
    """Return the share of a picture that is not white, and how much of its rim is."""
    from matplotlib.image import imread

    dark = imread(path)[..., :3].min(axis=2) < 0.85
    rim = dark[:4].any() or dark[-4:].any() or dark[:, :4].any() or dark[:, -4:].any()
    return dark.mean(), rim


@needs_poppler
def test_pages_rendered(tmp_path):
    (tmp_path / "sheet.pdf").write_bytes(hostile_pdf())
    command = [PDFTOPPM, "-r", "50", "-png", "sheet.pdf", "page"]
    found = subprocess.run(command, cwd=tmp_path, capture_output=True, check=True)
    assert found.stderr == b""
    for page in tmp_path.glob("page*.png"):
        share, rim = ink(page)
        assert 0.005 < share < 0.5
        assert not rim


@needs_chromium
def test_html_in_a_browser(tmp_path):
    (tmp_path / "sheet.html").write_text(render_html(sheet("".join(HOSTILE)), drawn()), encoding="utf-8")
    command = [CHROMIUM, "--headless", "--no-sandbox", "--disable-gpu", f"--user-data-dir={tmp_path}/profile",
               f"--screenshot={tmp_path}/seen.png", f"file://{tmp_path}/sheet.html"]  # fmt: skip
    subprocess.run(command, capture_output=True, check=True, timeout=60)
    assert 0.005 < ink(tmp_path / "seen.png")[0] < 0.4


# --- a job whose every word is hostile ----------------------------------------------------------------------

JOB = """
title = {0}
unit = "mm"
author = {1}
checker = {2}
revision = {3}
date = {4}
remarks = {5}
[outline]
file = {file}
file_unit = "mm"
[material]
name = {6}
source = {7}
shear_modulus = "27 GPa"
shear_yield = "100 MPa"
[[cases]]
name = {8}
torque = 1000
[[cases]]
name = {9}
torque = 2000
[bar]
[[bar.segments]]
name = {10}
length = 10
[[bar.segments]]
name = {11}
length = 10
[[compare.plates]]
name = {4}
width = 40
thickness = 10
[[compare.plates]]
name = {12}
width = 20
thickness = 5
[sheet]
sections = ["section", "inputs", "hand", "bar", "references"]
[tolerance]
torsion_constant = 0.05
peak_stress = 0.05
"""


def toml(text):
    return '"' + "".join(f"\\U{ord(s):08x}" for s in text if not 0xD800 <= ord(s) < 0xE000) + '"'


def test_a_job_whose_every_word_is_hostile(tmp_path):
    from torsionfe.job.content import sheet_of
    from torsionfe.job.reading import read_job
    from torsionfe.job.running import run_job
    from torsionfe.job.writing import result_words

    name = "<b>$x$ & 'y'.wkt"
    (tmp_path / name).write_text("POLYGON ((0 0, 40 0, 40 10, 0 10, 0 0))")
    texts = [text[:180] or "x" for text in HOSTILE]
    (tmp_path / "job.toml").write_text(JOB.format(*map(toml, texts), file=toml(name)))
    result = run_job(read_job(tmp_path / "job.toml"))
    made = sheet_of(result)
    found = Reading(render_html(made, dict.fromkeys([picture.name for picture, _ in made.pictures()], drawn()["dots"])))
    assert found.tags <= PLAIN_TAGS | SVG_TAGS
    shown = "\n".join(found.texts)
    for text in (*texts[:13], name):
        assert printable(text) in shown
    assert not re.search(r"[\x00-\x08\x0b-\x1f\x7f\u202a-\u202e]", result_words(result))
    assert len(render_pdf(made)) > 10_000
