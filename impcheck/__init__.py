"""impcheck finds every impedance discontinuity of a board's declared nets from its fabrication files.

`from impcheck import check` gives the result document of a board; `impcheck.fields` solves a cross-section by itself.
"""

from __future__ import annotations

from importlib.metadata import version
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from impcheck.errors import InputError
    from impcheck.pipeline import check

__all__ = ["InputError", "check"]
__version__ = version("impcheck")


def __getattr__(name: str) -> Any:
    # heavy imports wait until something is asked for
    if name == "check":
        from impcheck.pipeline import check

        return check
    if name == "InputError":
        from impcheck.errors import InputError

        return InputError
    raise AttributeError(f"module 'impcheck' has no attribute '{name}'")
