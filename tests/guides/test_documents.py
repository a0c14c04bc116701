"""What the README and the guides show is what happens."""

import re
from pathlib import Path

import pytest

from newel.catalogue.registry import Registry
from tests.guides.documents import (
    GUIDES,
    INSTALLS,
    README,
    ROOT,
    RUN,
    agrees,
    documents,
    faults,
    read_blocks,
    runnable,
)


@pytest.mark.parametrize("path", documents(), ids=lambda path: path.stem)
def test_every_block_of_a_document_does_what_it_shows(path: Path, tmp_path: Path) -> None:
    wrong = faults(runnable(path), tmp_path)
    assert not wrong, f"{path.name}\n" + "\n".join(map(str, wrong))


@pytest.mark.parametrize("path", documents(), ids=lambda path: path.stem)
def test_every_fence_is_closed_and_names_a_language_that_the_tests_know(path: Path) -> None:
    blocks = read_blocks(path)
    fences = re.findall(r"^```", path.read_text(encoding="utf-8"), re.MULTILINE)
    assert len(fences) == 2 * len(blocks)
    assert {block.language for block in blocks} <= {*RUN, "text", "toml"}


@pytest.mark.parametrize("path", documents(), ids=lambda path: path.stem)
def test_every_output_follows_the_block_that_prints_it(path: Path) -> None:
    blocks = read_blocks(path)
    for before, block in zip([None, *blocks], blocks, strict=False):
        if block.language == "text":
            assert before is not None, f"{path.name}:{block.line}"
            assert before.language in RUN, f"{path.name}:{block.line}"
            assert before.file is None, f"{path.name}:{block.line}"


@pytest.mark.parametrize("path", documents(), ids=lambda path: path.stem)
def test_what_a_table_of_contents_points_to_is_there(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    for target in re.findall(r"\]\(([^)#]+)\)", text):
        assert (path.parent / target).exists(), f"{path.name} points to {target}"
    for topic in re.findall(r"newel guide ([a-z-]+)", text):
        assert (ROOT / "src" / "newel" / "guide" / f"{topic}.md").exists(), f"{path.name} names {topic}"


def test_the_readme_begins_with_two_commands_of_one_line_that_need_nothing_before_them() -> None:
    first, second = read_blocks(README)[:INSTALLS]
    for block in (first, second):
        assert block.language == "sh"
        assert len(block.text.splitlines()) == 1
        assert block.text.startswith("python3 -m venv .venv && .venv/bin/pip install ")
    assert "newel march example:lock " in first.text
    assert "--force" in first.text, "it must be repeatable"
    assert second.text.split(" && ")[-1].split()[0] == ".venv/bin/pytest"


def test_the_counts_of_methods_in_the_readme_are_true() -> None:
    registry = Registry(folders=[], plugins=False, cache=None)
    summaries = registry.summaries()
    text = " ".join(README.read_text(encoding="utf-8").split())
    stated = re.findall(r"(\d+) published methods, of orders (\d+) to (\d+); (\d+) of them are pairs", text)
    pairs = [each for each in summaries if each.embedded_order is not None]
    orders = [each.order for each in summaries]
    true = (str(len(summaries)), str(min(orders)), str(max(orders)), str(len(pairs)))
    assert stated == [true]


def test_an_output_agrees_up_to_the_dots_and_the_count_of_last_places_alone() -> None:
    assert agrees("a … c\n", "a b c  \n")
    assert not agrees("a … c\n", "a b d\n")
    assert agrees("at most 8 units in the last place\n", "at most 70 units in the last place\n")
    assert not agrees("at most 8 units in the last place\n", "at most 81 units in the last place\n")
    assert not agrees("8 steps\n", "9 steps\n")


@pytest.mark.parametrize("path", [README, GUIDES / "replace-your-loop.md"], ids=lambda path: path.stem)
def test_twelve_lines_become_one_and_seven_compare_them(path: Path) -> None:
    before, after, compare = [block.text for block in read_blocks(path) if block.language == "python"][:3]
    loop = before[before.index("t, y, h = ") :].splitlines()
    march = [line for line in after.splitlines() if line and not line.startswith("import ")]
    assert (len(loop), len(march), len(compare.splitlines())) == (12, 1, 7)
