"""Printed constants, each beside its source: standard populations and years left to live."""

from engine.standards.european import EUROPEAN
from engine.standards.standard import Standard
from engine.standards.united_states import UNITED_STATES
from engine.standards.world import WORLD

__all__ = ["STANDARDS", "Standard"]

STANDARDS: dict[str, Standard] = {
    standard.key: standard for standard in (*EUROPEAN, *WORLD, *UNITED_STATES)
}
