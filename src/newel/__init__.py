"""newel: explicit Runge–Kutta steppers with a registry of proven Butcher tableaux.

Every public name is loaded on its first use, so that `import newel` costs little more than `import numpy`.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from newel import errors as errors
    from newel import testing as testing
    from newel.catalogue.access import find as find
    from newel.catalogue.access import names as names
    from newel.catalogue.access import plugins as plugins
    from newel.catalogue.access import read_tableau as read_tableau
    from newel.catalogue.access import register as register
    from newel.catalogue.checking import check as check
    from newel.catalogue.identify import identify as identify
    from newel.catalogue.inspection import inspect as inspect
    from newel.catalogue.recognition import recover as recover
    from newel.catalogue.registry import Registry as Registry
    from newel.catalogue.taking_away import export as export
    from newel.errors import MarchFailed as MarchFailed
    from newel.errors import MarchInterrupted as MarchInterrupted
    from newel.errors import NewelError as NewelError
    from newel.errors import NewelWarning as NewelWarning
    from newel.guide import guide as guide
    from newel.marching.march import march as march
    from newel.marching.one_step import one_step as one_step
    from newel.marching.stepper import Stepper as Stepper
    from newel.methods.drafting import draft as draft
    from newel.methods.storage import Storage as Storage
    from newel.methods.tableau import Notes as Notes
    from newel.methods.tableau import Tableau as Tableau
    from newel.methods.tableau_file import write_tableau as write_tableau
    from newel.models.events import StateEvent as StateEvent
    from newel.models.examine import examine as examine
    from newel.models.layout import Layout as Layout
    from newel.models.loading import load_model as load_model
    from newel.models.model import Model as Model
    from newel.results import pictures as pictures
    from newel.results import sinks as sinks
    from newel.results.run import Run as Run
    from newel.stepping import controllers as controllers
    from newel.stepping.rules import Adaptive as Adaptive
    from newel.stepping.rules import Fixed as Fixed
    from newel.stepping.rules import Given as Given

__version__ = "0.1.0"

_WHERE = {
    "Adaptive": "newel.stepping.rules",
    "Fixed": "newel.stepping.rules",
    "Given": "newel.stepping.rules",
    "Layout": "newel.models.layout",
    "MarchFailed": "newel.errors",
    "MarchInterrupted": "newel.errors",
    "Model": "newel.models.model",
    "NewelError": "newel.errors",
    "NewelWarning": "newel.errors",
    "Notes": "newel.methods.tableau",
    "Registry": "newel.catalogue.registry",
    "Run": "newel.results.run",
    "StateEvent": "newel.models.events",
    "Stepper": "newel.marching.stepper",
    "Storage": "newel.methods.storage",
    "Tableau": "newel.methods.tableau",
    "check": "newel.catalogue.checking",
    "draft": "newel.methods.drafting",
    "examine": "newel.models.examine",
    "export": "newel.catalogue.taking_away",
    "find": "newel.catalogue.access",
    "guide": "newel.guide",
    "identify": "newel.catalogue.identify",
    "inspect": "newel.catalogue.inspection",
    "load_model": "newel.models.loading",
    "march": "newel.marching.march",
    "names": "newel.catalogue.access",
    "one_step": "newel.marching.one_step",
    "plugins": "newel.catalogue.access",
    "read_tableau": "newel.catalogue.access",
    "recover": "newel.catalogue.recognition",
    "register": "newel.catalogue.access",
    "write_tableau": "newel.methods.tableau_file",
}
_MODULES = {
    "controllers": "newel.stepping.controllers",
    "errors": "newel.errors",
    "pictures": "newel.results.pictures",
    "sinks": "newel.results.sinks",
    "testing": "newel.testing",
}

__all__ = sorted([*_WHERE, *_MODULES, "__version__"])


def __getattr__(name: str) -> Any:
    """Load a public name on its first use."""
    if name in _MODULES:
        value: Any = import_module(_MODULES[name])
    elif name in _WHERE:
        value = getattr(import_module(_WHERE[name]), name)
    else:
        raise AttributeError(f"module 'newel' has no attribute {name!r}; its names: {', '.join(__all__)}")
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return __all__
