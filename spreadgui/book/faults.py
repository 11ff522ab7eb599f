"""A fault: where in a file, and what is wrong there, as one sentence."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True)
class Fault:
    """`where` leads to the place ("positions[3].strike", "line 12, strike"); it is empty for a whole file."""

    where: str
    what: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}" if self.where else self.what


class BookError(Exception):
    """A file cannot be taken as it is; carries every fault that was found, in the file's order."""

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = tuple(faults)
        super().__init__("\n".join(map(str, self.faults)))
