"""The verbs, one file each; here the records their callers hand to them."""

from server.accounts.viewer import LOCAL, Viewer
from server.intake.mapping import Mapping
from server.store.connect import Session
from server.store.records import Basis, Terms

__all__ = ["LOCAL", "Basis", "Mapping", "Session", "Terms", "Viewer"]
