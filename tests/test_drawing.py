"""The drawing of a beam: every mark and load is there and looks different, lines are to scale, peaks are written."""

from __future__ import annotations

import itertools
import re
from xml.etree import ElementTree

import pytest
from beams import Beam, beams
from hypothesis import given, settings

from beamfuncs.errors import BeamError
from beamfuncs.functions import deflection_max, moment_at, moment_max, moment_min, shear_max, shear_min
from beamfuncs.hosts.headless.canvas import FONT_SIZE, LINE_HEIGHT, Box, Canvas, width_of
from beamfuncs.hosts.headless.drawing import MARGIN, MOMENT_COLOUR, MOST_LOADS, SHEAR_COLOUR, WIDTH, drawing

SVG = "{http://www.w3.org/2000/svg}"
MANY = "; ".join(f"point {n} at {n / 10}" for n in range(1, 70))
BEAMS = [
    ("fixed 8 pinned", "udl 12", None, None),
    ("free 1.5 pinned 6 roller 1.5 free", "G: udl 5; Q: udl 12 in span 1; Q: point 40 at 3", None, "1.35 G + 1.5 Q"),
    ("fixed 4 hinge 3 pinned 5 spring(2500) 4 guided", "point 40 at 2; couple 15 at 9", 24000, None),
    ("pinned 3 step 5 spring(2500, 800) 6 fixed", "udl -5; varying -4 to 8 from 0 to 8", "2e4 4e4 2e4", None),
    ("pinned 8 pinned", MANY, None, None),
    (" ".join(["pinned", *["0.5 pinned"] * 40]), "udl 7", None, None),
    ("pinned 0.001 roller 900 roller", "udl 6; settle -0.01 at support 1; settle 0.02 at support 1", 1000, None),
    ("fixed 3 free", "udl 0", None, None),
    ("fixed 3 free", "point 123456789.123 at 3", None, None),
]


def root(svg: str) -> ElementTree.Element:
    """The drawing, parsed."""
    return ElementTree.fromstring(svg)


def words(svg: str) -> list[str]:
    """Every label."""
    return [element.text or "" for element in root(svg).iter(f"{SVG}text")]


def shapes(svg: str) -> list[str]:
    """The elements that are no labels, as text, with the background of each label left out."""
    found = [
        element
        for element in root(svg).iter()
        if element.tag.removeprefix(SVG) in ("polyline", "polygon", "path", "circle")
    ]
    return [ElementTree.tostring(element).decode() for element in found]


def curve(svg: str, colour: str) -> list[tuple[float, float]]:
    """The points of the line of one colour."""
    (points,) = re.findall(rf'<polyline points="([^"]*)"[^>]*stroke="{colour}"', svg)
    return [(float(x), float(y)) for x, y in (pair.split(",") for pair in points.split())]


# --- the whole sheet -------------------------------------------------------------------------------


def check(svg: str) -> None:
    """Every label and every point lies on the sheet, and no label covers another."""
    left, top, width, height = map(float, root(svg).attrib["viewBox"].split())
    boxes = []
    for text in root(svg).iter(f"{SVG}text"):
        x, y = float(text.attrib["x"]), float(text.attrib["y"])
        boxes.append(Box(x, y - 0.7 * FONT_SIZE, x + width_of(text.text or ""), y))
    for box in boxes:
        assert left <= box.left
        assert box.right <= left + width
        assert top <= box.top
        assert box.bottom <= top + height
    for one, other in itertools.combinations(boxes, 2):
        assert not one.meets(other)
    for element in root(svg).iter():
        for x, y in re.findall(r"([-\d.]+)[, ]([-\d.]+)", element.get("points", "") + " " + element.get("d", "")):
            assert left - 1 <= float(x) <= left + width + 1
            assert top <= float(y) <= top + height


@pytest.mark.parametrize("arguments", BEAMS, ids=lambda one: one[0][:20])
def test_nothing_is_cut_off_and_no_labels_overlap(arguments: tuple[str, str, object, str | None]) -> None:
    """Long beams and short ones, many loads and none: the drawing holds all of it, legibly."""
    check(drawing(*arguments))


@settings(max_examples=60, deadline=None, derandomize=True)
@given(beams())
def test_any_beam_is_drawn_whole_with_its_extremes(beam: Beam) -> None:
    """Of beams with every mark and load nothing is cut off, and the largest and smallest moment are written."""
    svg = drawing(*beam.cells)
    check(svg)
    line, loads, stiffness, combination = beam.cells
    extremes = [extreme(line, loads, None, stiffness, combination) for extreme in (moment_max, moment_min)]
    for value in extremes:
        if abs(value) > 1e-6 * max(map(abs, extremes)):
            assert {shown(value), f"{value:.0f}".replace("-", "−")} & set(words(svg))


def test_a_label_that_would_overlap_is_seen() -> None:
    """The check of the test above bites: a label refused its place is not written over another."""
    canvas = Canvas(200)
    assert canvas.label("first", [(50, 10)])
    assert not canvas.label("other", [(52, 12)])
    assert canvas.label("other", [(52, 12), (52, 12 + 2 * LINE_HEIGHT)])
    assert words(canvas.svg("two")) == ["first", "other"]


def test_the_same_beam_is_drawn_the_same() -> None:
    """Two drawings of one beam are equal; another load gives another drawing."""
    assert drawing("fixed 8 pinned", "udl 12") == drawing("FIX 8.0 pin", "uniform 12")
    assert drawing("fixed 8 pinned", "udl 12") != drawing("fixed 8 pinned", "udl 12 from 0 to 7")


def test_nothing_is_fetched_and_no_script_runs() -> None:
    """The drawing refers to nothing outside it, and has no ids that two drawings of one page could share."""
    for arguments in BEAMS:
        svg = drawing(*arguments)
        assert not re.search(r"href|url\(|<script|<style|<image|\bid=|\bon\w+=", svg)


def test_hostile_names_are_text() -> None:
    """Whatever a combination or a case is called stands there as text."""
    svg = drawing("fixed 8 pinned", "G: udl 5", None, "1.35 G")
    assert "Shear V and moment M under 1.35 G" in words(svg)
    canvas = Canvas(400)
    canvas.label("</text><script>alert(1)</script>\x00", [(0, 0)])
    (text,) = words(canvas.svg("<b>&"))
    assert text == "</text><script>alert(1)</script>\ufffd"


# --- marks and loads -------------------------------------------------------------------------------

ENDS = ["fixed", "pinned", "roller", "guided", "spring(9)", "spring(9, 4)", "free"]
INSIDE = ["fixed", "pinned", "roller", "guided", "spring(9)", "spring(9, 4)", "hinge", "step"]


def test_every_mark_looks_different() -> None:
    """At an end and inside, no two kinds of mark are drawn with the same strokes."""
    ends = [shapes(drawing(f"fixed 4 {mark}", "udl 0")) for mark in ENDS]
    inside = [shapes(drawing(f"fixed 4 {mark} 4 fixed", "udl 0")) for mark in INSIDE]
    for signs in (ends, inside):
        for one, other in itertools.combinations(signs, 2):
            assert one != other


def test_a_roller_rolls() -> None:
    """The roller stands on two wheels, the hinge is one ring, the guided end has two; the others have none."""
    wheels = {"fixed": 0, "pinned": 0, "roller": 2, "guided": 2, "free": 0, "spring(9)": 0}
    for mark, count in wheels.items():
        assert drawing(f"fixed 4 {mark}", "udl 0").count("<circle") == count
    assert drawing("fixed 4 hinge 4 pinned", "udl 0").count("<circle") == 1


def test_supports_are_numbered_and_lengths_written() -> None:
    """Each support has its number from the left, a spring its stiffnesses, each length its size."""
    told = words(drawing("free 1.25 pinned 6 hinge 2.5 spring(900, 40) 3 roller", "udl 0"))
    assert {"1", "2: kv 900, kr 40", "3", "1.25", "6", "2.5"} <= set(told)
    assert "4" not in told


def test_equal_lengths_that_are_short_are_counted() -> None:
    """Where there is no room to write each length, equal ones are counted."""
    assert "40 × 0.5" in words(drawing(*BEAMS[5]))


LOADS = {
    "udl 12": "12",
    "udl 12 from 2 to 6": "12, 2 to 6",
    "varying 0 to 12 from 2 to 6": "0 to 12, 2 to 6",
    "varying -3 to 12 from 2 to 6": "−3 to 12, 2 to 6",
    "point 40 at 3": "40 at 3",
    "couple 15 at 4": "couple 15 at 4",
    "settle 0.01 at support 2": "sinks 0.01",
    "settle -0.01 at support 2": "rises 0.01",
    "rotate 0.001 at support 1": "turns 0.001",
    "curvature 1e-4 from 0 to 8": "free curvature 0.0001, 0 to 8",
}


@pytest.mark.parametrize("load", LOADS)
def test_every_load_is_drawn_and_told(load: str) -> None:
    """Each kind of load adds strokes of its own and says its size and place; its case stands before them."""
    bare = shapes(drawing("fixed 8 fixed", "settle 0 at support 1", 1000))
    assert LOADS[load] in words(drawing("fixed 8 fixed", load, 1000))
    assert f"Q: {LOADS[load]}" in words(drawing("fixed 8 fixed", f"Q: {load}", 1000, "1.5 Q"))
    assert shapes(drawing("fixed 8 fixed", load, 1000)) != bare


@pytest.mark.parametrize(
    "load", ["udl {}", "point {} at 3", "couple {} at 3", "settle {} at support 2", "rotate {} at support 1"]
)
def test_the_opposite_load_has_the_opposite_arrow(load: str) -> None:
    """A load and its negative share their size and differ in their arrows."""
    one, other = (drawing("fixed 8 fixed", load.format(size), 1000) for size in (5, -5))
    beam_one, beam_other = (svg.split("Shear V")[0] for svg in (one, other))
    assert beam_one != beam_other
    assert {"5", "5 at 3", "couple 5 at 3", "sinks 5", "turns 5"} & set(words(one))


def test_a_point_load_stands_at_its_place() -> None:
    """The arrow ends at the beam where the load is, to scale along the drawn length."""
    svg = drawing("fixed 8 pinned", "point 40 at 3")
    expected = MARGIN + 3 / 8 * (WIDTH - 2 * MARGIN)
    assert f"M{expected:.1f} -3L" in svg


def test_a_load_that_the_combination_leaves_out_is_dashed() -> None:
    """Only what does not count in the combination is dashed."""
    with_all = drawing("fixed 8 pinned", "G: udl 5; Q: point 40 at 3", None, "G + Q")
    without = drawing("fixed 8 pinned", "G: udl 5; Q: point 40 at 3", None, "1.35 G")
    assert "stroke-dasharray" not in with_all
    assert "stroke-dasharray" in without


def test_very_many_loads_are_counted() -> None:
    """Of very many loads the first are drawn; how many are not is said."""
    assert f"and {69 - MOST_LOADS} more loads, not drawn" in words(drawing(*BEAMS[4]))


# --- the lines -------------------------------------------------------------------------------------


def shown(number: float) -> str:
    """A number as the drawings write it."""
    return f"{number:.4g}".replace("-", "−")


def test_peaks_are_written_with_their_values() -> None:
    """The largest and smallest moment and shear of each span are there, as the functions give them."""
    beam, loads, combination = (
        "pinned 5 roller 7 roller 4 fixed",
        "G: udl 6.25; Q: udl 12.5 in span 2",
        "1.35 G + 1.5 Q",
    )
    told = words(drawing(beam, loads, None, combination))
    for span in (1, 2, 3):
        for function in (moment_max, moment_min, shear_max, shear_min):
            value = function(beam, loads, span, None, combination)
            if value:
                assert shown(value) in told, (function, span)


def test_known_peaks() -> None:
    """A propped beam under a uniform load: 5qL/8, 3qL/8, qL²/8 and 9qL²/128 (closed form)."""
    q, length = 12.0, 8.0
    told = words(drawing("fixed 8 pinned", "udl 12"))
    for value in (5 * q * length / 8, -3 * q * length / 8, -q * length**2 / 8, 9 * q * length**2 / 128):
        assert shown(value) in told
    assert shown(1.01 * q * length**2 / 8) not in told


def test_both_sides_of_a_jump_are_written() -> None:
    """Beside a couple both moments are there, beside a force both shears: R and R - P, M and M + C (statics)."""
    told = words(drawing("pinned 8 roller", "couple 16 at 3"))
    assert {shown(-16 / 8 * 3), shown(16 - 16 / 8 * 3)} <= set(told)
    told = words(drawing("pinned 8 roller", "point 40 at 2; point 24 at 4"))
    left = (40 * 6 + 24 * 4) / 8
    assert {shown(left), shown(left - 40), shown(left - 64)} <= set(told)


def test_the_moment_line_is_on_the_tension_side_and_to_scale() -> None:
    """Sagging below the axis and hogging above it, in proportion to the values; shear upward where positive."""
    svg = drawing("fixed 8 pinned", "udl 12")
    line = curve(svg, MOMENT_COLOUR)
    axis = line[0][1]
    assert line[0][1] == line[-1][1] == axis
    heights = [y - axis for _, y in line]
    hogging, sagging = min(heights), max(heights)
    assert hogging / sagging == pytest.approx(-96 / 54, rel=0.01)
    x, y = line[len(line) // 2]
    place = (x - MARGIN) / (WIDTH - 2 * MARGIN) * 8
    assert (y - axis) / sagging == pytest.approx(moment_at("fixed 8 pinned", "udl 12", place) / 54, abs=0.01)
    shear = curve(svg, SHEAR_COLOUR)
    assert shear[1][1] < shear[0][1] < shear[-2][1]


def test_lines_follow_the_combination() -> None:
    """Another combination of the same loads gives other lines with the peaks of that combination."""
    beam, loads = "pinned 6 roller", "G: udl 5; Q: point 40 at 2"
    for combination in ("1 G", "1.35 G + 1.5 Q"):
        assert shown(moment_max(beam, loads, None, None, combination)) in words(drawing(beam, loads, None, combination))


def test_an_unloaded_beam_has_flat_lines() -> None:
    """With no load the lines lie on their axes and say 0."""
    svg = drawing("fixed 3 free", "udl 0")
    assert words(svg).count("0") == 3
    assert len({y for _, y in curve(svg, MOMENT_COLOUR)}) == 1


def test_a_beam_that_cannot_be_solved_says_why() -> None:
    """A mechanism, or a stiffness that is missing, is drawn without lines, with the reason."""
    for beam, loads in (("pinned 4 hinge 4 free", "udl 3"), ("fixed 4 spring(9) 4 fixed", "udl 3")):
        with pytest.raises(BeamError) as refusal:
            moment_max(beam, loads)
        svg = drawing(beam, loads)
        assert refusal.value.reason[:40] in " ".join(words(svg))
        assert MOMENT_COLOUR not in svg


def test_what_cannot_be_read_is_refused() -> None:
    """An unreadable beam, load or combination is the functions' own error."""
    for arguments in (("fixed", "udl 1"), ("fixed 8 pinned", "udl"), ("fixed 8 pinned", "udl 1", None, "G")):
        with pytest.raises(BeamError):
            drawing(*arguments)


def test_stiffness_changes_the_thickness() -> None:
    """A stiffer length is drawn thicker; lengths of one stiffness are drawn alike."""

    def heights(stiffness: str) -> list[float]:
        svg = drawing("pinned 3 step 5 roller", "udl 1", stiffness)
        beams = re.findall(r'<polygon points="([^"]*)" fill="#1a1a1a" stroke="none"', svg)
        return [2 * abs(float(points.split()[0].split(",")[1])) for points in beams]

    thin, thick = heights("2e4 4e4")
    assert thin < thick
    assert heights("3e4 3e4") == [thin, thin]
    assert deflection_max("pinned 3 step 5 roller", "udl 1", None, "2e4 4e4") > 0
