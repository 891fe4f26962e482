"""From a folder of quantum-chemistry outputs to the rate of a mechanism over temperature.

The way the data goes: ``read`` an output or ``collect`` a folder of them, ``thermochemistry`` of a
calculation, and a ``Study`` (a TOML file beside the outputs) for the profile and the effective
barrier of a mechanism.

>>> import thermo_pp as tp
>>> tp.__version__
'0.1.0'
"""

from __future__ import annotations

import sys
from importlib import import_module
from types import ModuleType
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from thermo_pp.audit import collect as collect
    from thermo_pp.collect import Collection as Collection
    from thermo_pp.errors import Finding as Finding
    from thermo_pp.errors import ReadError as ReadError
    from thermo_pp.errors import StudyError as StudyError
    from thermo_pp.errors import ThermoError as ThermoError
    from thermo_pp.output import figures as figures
    from thermo_pp.readers import read as read
    from thermo_pp.records import Calculation as Calculation
    from thermo_pp.species import thermochemistry as thermochemistry
    from thermo_pp.study.load import Study as Study

__version__ = "0.1.0"

_HOME = {
    "Calculation": "records",
    "Collection": "collect",
    "Finding": "errors",
    "ReadError": "errors",
    "Study": "study.load",
    "StudyError": "errors",
    "ThermoError": "errors",
    "collect": "audit",
    "figures": "output.figures",
    "read": "readers",
    "thermochemistry": "species",
}
"""Public name -> the module it lives in, or is; imported on first use."""

__all__ = [  # noqa: RUF022
    "read", "collect", "thermochemistry", "Study", "Calculation", "Collection",
    "Finding", "ThermoError", "ReadError", "StudyError", "figures", "__version__",
]  # fmt: skip


class _Package(ModuleType):
    """The package as a module that keeps a function where a folder has the same name."""

    def __setattr__(self, name: str, value: object) -> None:
        # importing thermo_pp.collect, the folder, would put it in the place of the function
        if not (name in _HOME and isinstance(value, ModuleType)):
            super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package


def __getattr__(name: str) -> Any:
    """Import a public name from where it lives."""
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    home = import_module(f"{__name__}.{_HOME[name]}")
    value = home if _HOME[name].endswith(f".{name}") else getattr(home, name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """Return the public names."""
    return sorted({*globals(), *__all__})
