"""The two ways optopick refuses: the input is wrong, or the program contradicts itself."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True)
class Mistake:
    """One thing wrong in the input: where it is, what was found there, what was expected."""

    where: str
    found: str
    expected: str

    def __str__(self) -> str:
        return f"{self.where}: found {self.found}; expected {self.expected}"


class InputError(Exception):
    """The user's input is wrong. Carries every mistake of the file at once."""

    def __init__(self, mistakes: Iterable[Mistake]) -> None:
        self.mistakes: tuple[Mistake, ...] = tuple(mistakes)
        super().__init__("\n".join(str(mistake) for mistake in self.mistakes))


class DisagreementError(Exception):
    """The model and the re-check from physics disagree about a check: a defect, never a result."""
