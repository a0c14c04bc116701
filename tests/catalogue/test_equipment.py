"""Controllers and sinks by name, by ending, and ready-made."""

import pytest

from newel.catalogue.registry import Registry
from newel.errors import BadRequest, UnknownName
from newel.results.sinks.csv_file import Csv
from newel.results.sinks.json_lines import JsonLines

pytestmark = pytest.mark.core

STAND = Registry(folders=[], plugins=False, cache=None)


class Patient:
    """A controller that accepts everything and keeps the length."""

    name = "patient"

    def start(self) -> tuple[float, ...]:
        return ()

    def decide(
        self, error: float, step: float, order: int, memory: tuple[float, ...]
    ) -> tuple[bool, float, tuple[float, ...]]:
        return True, 1.0, memory


def test_a_named_controller_gets_its_arguments() -> None:
    bold, careful = STAND.controller("elementary"), STAND.controller("elementary", safety=0.45)
    factors = [each.decide(1.0, 1.0, 5, each.start())[1] for each in (bold, careful)]
    assert factors == [0.9, 0.45]


def test_a_ready_controller_comes_back_itself() -> None:
    patient = Patient()
    assert STAND.controller(patient) is patient


def test_arguments_for_a_ready_controller_are_an_error_not_ignored() -> None:
    with pytest.raises(BadRequest, match="b:"):
        STAND.controller(Patient(), b=4)


def test_an_argument_that_a_controller_does_not_take_is_named_with_its_signature() -> None:
    with pytest.raises(BadRequest, match=r"(?s)wideness=3.*It takes"):
        STAND.controller("soderlind-h211b", **{"wideness": 3})


@pytest.mark.parametrize("thing", [Patient, 0.9, None, object()])
def test_what_is_no_controller_is_refused(thing: object) -> None:
    """A class in place of an object of it is the usual slip."""
    with pytest.raises(BadRequest, match=r"decide\(error, step, order, memory\)"):
        STAND.controller(thing)  # type: ignore[arg-type]  # the wrong type is what is tested


def test_an_unknown_controller_or_sink_gets_near_names() -> None:
    with pytest.raises(UnknownName, match="gustafsson-pi") as caught:
        STAND.controller("gustafson-pi")
    assert caught.value.kind == "controller"
    with pytest.raises(UnknownName, match="json-lines"):
        STAND.sink("jsonlines")


@pytest.mark.parametrize("target", ["lock.csv", "a/b/LOCK.CSV", "./x.y.csv"])
def test_the_ending_chooses_the_sink_whatever_its_case(target: str) -> None:
    assert STAND.sink_for(target) is Csv


def test_json_lines_have_an_ending_of_their_own() -> None:
    assert {STAND.sink_for(f"run{ending}") for ending in JsonLines.endings} == {JsonLines}


@pytest.mark.parametrize("target", ["lock.xyz", "lock", "csv", ".csv"])
def test_an_ending_that_nobody_writes_is_named_with_those_that_there_are(target: str) -> None:
    with pytest.raises(UnknownName, match=r"Known: .*\.csv") as caught:
        STAND.sink_for(target)
    assert caught.value.kind == "file ending"
