"""Goals as typed on the command line."""

from __future__ import annotations

from difflib import get_close_matches

from optopick.brief import GoalName
from optopick.errors import InputError, Mistake


def goal_pair(first: str, second: str) -> tuple[GoalName, GoalName]:
    """Two different goals from their names; raises InputError with every mistake."""
    mistakes = []
    names = [goal.value for goal in GoalName]
    for option, text in (("--first", first), ("--second", second)):
        if text not in names:
            near = get_close_matches(text, names, n=1, cutoff=0.0)
            mistakes.append(Mistake(option, f'"{text}"', f"one of {', '.join(names)}; the nearest is {near[0]}"))
    if not mistakes and first == second:
        mistakes.append(Mistake("--second", f'"{second}"', "another goal than --first"))
    if mistakes:
        raise InputError(mistakes)
    return GoalName(first), GoalName(second)
