"""What cannot be simulated."""


class NotSimulatedError(Exception):
    """A link that the transistor model cannot stand for; the message says why, for people."""
