"""Published methods for options on the spread of two forwards: arrays in, arrays out, NumPy and SciPy only.

Every method module has `value` and `sensitivities` of the same arguments; `methods` declares them all. A module is
loaded when it is first named: SciPy takes longer to load than a window to be painted, and that needs only the table.
"""

from importlib import import_module
from types import ModuleType

__all__ = [
    "bachelier",
    "bjerksund_stensland",
    "black76",
    "implied",
    "kirk",
    "margrabe",
    "modified_kirk",
    "shifted",
    "simulation",
    "yardstick",
]


def __getattr__(name: str) -> ModuleType:
    if name in __all__:
        return import_module(f"{__name__}.{name}")
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
