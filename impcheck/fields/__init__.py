"""Fields of cross-sections: `solve(Section(...))` gives a Line with impedance, effective permittivity and delay. Usable by itself."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from impcheck.fields.line import Line
    from impcheck.fields.section import Coating, Conductor, Section, SectionError, Slab
    from impcheck.fields.solver import solve

__all__ = ["Coating", "Conductor", "Line", "Section", "SectionError", "Slab", "solve"]


def __getattr__(name: str) -> Any:
    # the solver's imports wait until it is used
    if name in __all__:
        from impcheck.fields import line, section, solver

        return next(getattr(module, name) for module in (section, line, solver) if hasattr(module, name))
    raise AttributeError(f"module 'impcheck.fields' has no attribute '{name}'")
