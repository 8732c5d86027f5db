"""Limits that contradict each other: a set of which no part contradicts itself."""

from __future__ import annotations

from collections.abc import Callable, Sequence

Contradicts = Callable[[frozenset[str]], bool]
"""Whether no design holds all limits but those dropped. May only rise from false to true as fewer are dropped."""


def minimal_conflict(names: Sequence[str], out: frozenset[str], contradicts: Contradicts) -> tuple[str, ...] | None:
    """A minimal contradicting set among `names` not in `out`; None where those do not contradict each other.

    Of several such sets one whose limits come early in `names`. Divide and conquer: Junker, "QuickXplain", AAAI 2004.
    """
    wanted = [name for name in names if name not in out]
    if not contradicts(out):
        return None
    everything = frozenset(names) | out
    found = _needed(frozenset(), False, wanted, lambda kept: contradicts(everything - kept))
    return tuple(name for name in names if name in found)


def _needed(
    kept: frozenset[str], grown: bool, wanted: Sequence[str], contradict: Callable[[frozenset[str]], bool]
) -> frozenset[str]:
    """The least of `wanted` that contradicts together with `kept`; `kept` has just grown where `grown`."""
    if grown and contradict(kept):
        return frozenset()
    if len(wanted) <= 1:
        return frozenset(wanted)
    early, late = wanted[: len(wanted) // 2], wanted[len(wanted) // 2 :]
    of_late = _needed(kept | frozenset(early), True, late, contradict)
    return of_late | _needed(kept | of_late, bool(of_late), early, contradict)
