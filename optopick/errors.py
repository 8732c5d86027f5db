"""The ways optopick refuses: the input is wrong, the program contradicts itself, or work was lost again and again."""

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

    def __reduce__(self) -> tuple[type[InputError], tuple[tuple[Mistake, ...]]]:
        """From its mistakes: what an exception does by itself, from its message, loses them between processes."""
        return type(self), (self.mistakes,)


class DisagreementError(Exception):
    """The model and the re-check from physics disagree about a check: a defect, never a result."""


class WorkLostError(Exception):
    """What did a piece of work died each time it was tried, or there is nothing left to do it."""
