"""Every check of a design again, from the physics at every vertex of the uncertainty box, never from the model.

The model looks only at the ends of each range that it has reasons to think hurt; here all combinations of all ends
are tried, so that a wrong reason shows as a disagreement. Arrays carry one axis per uncertain quantity; a check spans
just the axes it depends on, which is also how its worst corner gets its words.
"""

from optopick.recheck.review import evaluate, review

__all__ = ["evaluate", "review"]
