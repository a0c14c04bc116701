"""Pictures of stability regions: what is drawn is where |R(z)| ≤ 1."""

from __future__ import annotations

import importlib.util
import re
import xml.etree.ElementTree as ElementTree
from math import hypot
from pathlib import Path

import numpy as np
import pytest

import newel
from newel.errors import BadRequest, OutputExists, OutputFailed
from newel.methods.analysis.stability_region import amplification
from newel.results.pictures import stability_region
from newel.results.pictures.outlines import outlines
from newel.results.pictures.svg import ticks

pytestmark = pytest.mark.core

EULER = newel.Tableau("euler-disc-1", order=1, matrix=[[]], weights=[1])
PAIR = ("kutta-4", "ssp-4-stages-10")


def test_the_outline_of_euler_is_the_unit_circle_about_minus_one() -> None:
    picture = stability_region(EULER)
    assert len(picture.lines[0]) == 1
    for x, y in picture.lines[0][0]:
        assert hypot(x + 1.0, y) == pytest.approx(1.0, abs=2e-3)
        assert y >= 0.0
    ends = sorted(picture.lines[0][0])
    assert ends[0] == pytest.approx((-2.0, 0.0), abs=0.1)
    assert ends[-1] == pytest.approx((0.0, 0.0), abs=0.1)


@pytest.mark.parametrize("slug", ["kutta-4", "dormand-prince-5-4", "carpenter-kennedy-4"])
def test_every_point_of_an_outline_has_amplification_one(slug: str) -> None:
    picture = stability_region(slug)
    for line in picture.lines[0]:
        z = np.array([complex(*point) for point in line])
        assert amplification(picture.methods[0], z) == pytest.approx(1.0, abs=0.02)


def test_the_text_is_filled_where_it_is_stable_and_symmetric() -> None:
    lines = stability_region("kutta-4").text(80).splitlines()
    body = [line[line.index("│") + 1 : -1] for line in lines if line.endswith("│")]
    assert body == body[::-1]
    assert max(map(len, lines)) <= 80
    row = body[len(body) // 2]
    left, right = stability_region("kutta-4").window[:2]
    stable = [k for k, character in enumerate(row) if character in "#·"]
    step = (right - left) / len(row)
    assert left + stable[0] * step == pytest.approx(-2.785, abs=step)
    assert left + (stable[-1] + 1) * step == pytest.approx(0.0, abs=step)
    assert lines[-1] == "kutta-4: |R(z)| ≤ 1, z = hλ"


def test_several_methods_have_a_digit_each_and_a_legend() -> None:
    text = stability_region(*PAIR).text(60)
    body = "".join(line for line in text.splitlines() if line.endswith("│"))
    assert {"1", "2"} <= set(body)
    assert "#" not in body
    assert "\n1 kutta-4\n2 ssp-4-stages-10\n" in text


def test_a_narrow_terminal_gets_forty_columns_and_no_less() -> None:
    lines = stability_region("kutta-4").text(10).splitlines()
    assert max(len(line) for line in lines if line.endswith("│")) <= 40


def test_at_equal_cost_a_region_is_divided_by_its_calls() -> None:
    plain, equal = stability_region("kutta-4"), stability_region("kutta-4", per_call=True)
    assert equal.scales == (4.0,)
    assert equal.window[0] == pytest.approx(plain.window[0] / 4, rel=1e-6)
    assert "divided by the rate calls of a step" in equal.text()


def test_svg_is_xml_with_a_dashed_path_and_a_name_for_each_method() -> None:
    root = ElementTree.fromstring(stability_region(*PAIR).svg())
    space = "{http://www.w3.org/2000/svg}"
    assert root.tag == f"{space}svg"
    words = [element.text for element in root.iter(f"{space}text")]
    assert set(PAIR) <= set(words)
    styles = [element.get("stroke-dasharray") for element in root.iter(f"{space}path")]
    assert "9 4" in styles
    _, _, width, height = map(float, root.attrib["viewBox"].split())
    drawn = [path.get("d", "") for path in root.iter(f"{space}path") if path.get("stroke-width")]
    for path in drawn:
        for x, y in re.findall(r"[ML]([-\d.]+) ([-\d.]+)", path):
            assert 0 <= float(x) <= width
            assert 0 <= float(y) <= height


def test_the_json_twin_has_window_and_outlines() -> None:
    data = stability_region("kutta-4").to_data()
    assert data["bottom"] == -data["top"]
    assert data["methods"][0]["slug"] == "kutta-4"
    assert len(data["methods"][0]["upper_outlines"][0][0]) == 2


def test_a_file_is_written_once_and_only_under_a_known_ending(tmp_path: Path) -> None:
    picture = stability_region("kutta-4")
    target = tmp_path / "region.svg"
    picture.write(target)
    assert target.read_text(encoding="utf-8") == picture.svg()
    with pytest.raises(OutputExists):
        picture.write(target)
    picture.write(target, overwrite=True)
    with pytest.raises(BadRequest, match=r"ends in \.svg or \.png"):
        picture.write(tmp_path / "region.jpg")
    with pytest.raises(OutputFailed):
        picture.write(tmp_path / "missing" / "region.svg")


@pytest.mark.skipif(importlib.util.find_spec("matplotlib") is not None, reason="matplotlib is installed")
def test_png_without_matplotlib_says_what_to_install(tmp_path: Path) -> None:
    with pytest.raises(BadRequest, match="pip install 'newel"):
        stability_region("kutta-4").write(tmp_path / "region.png")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.skipif(importlib.util.find_spec("matplotlib") is None, reason="matplotlib is not installed")
def test_png_is_png(tmp_path: Path) -> None:
    stability_region(*PAIR).write(tmp_path / "region.png")
    assert (tmp_path / "region.png").read_bytes().startswith(b"\x89PNG")


def test_none_and_ten_methods_are_refused() -> None:
    with pytest.raises(BadRequest, match="1 to 9 methods, not 0"):
        stability_region()
    with pytest.raises(BadRequest, match="1 to 9 methods, not 10"):
        stability_region(*["kutta-4"] * 10)


def test_outlines_close_around_each_island_and_join_at_saddles_once() -> None:
    x = y = np.linspace(-3.0, 3.0, 61)
    two = np.minimum(
        (x[None, :] - 1.5) ** 2 + y[:, None] ** 2 - 0.5, (x[None, :] + 1.5) ** 2 + y[:, None] ** 2 - 0.5
    )
    found = outlines(x, y, two)
    assert len(found) == 2
    assert all(line[0] == line[-1] for line in found)
    saddle = outlines(np.array([0.0, 1.0]), np.array([0.0, 1.0]), np.array([[-1.0, 2.0], [2.0, -1.0]]))
    assert len(saddle) == 2


@pytest.mark.parametrize(("low", "high"), [(-3.3, 0.6), (-200.0, 10.0), (-0.01, 0.01), (-7e5, 1.0)])
def test_ticks_are_few_round_and_inside(low: float, high: float) -> None:
    found = list(ticks(low, high))
    assert 4 <= len(found) <= 11
    assert all(low <= tick <= high for tick in found)
