"""The errors that a person sees: each is one line that names the thing, the value and the way out."""


class WattproofError(Exception):
    """Any error whose text is meant for a person."""


class WrongUseError(WattproofError):
    """A value, option or file that cannot be used as given (exit status 2)."""


class BenchLostError(WattproofError):
    """The bench no longer delivers: a device vanished, a server died, a recording ended."""


class StoppedError(WattproofError):
    """Work was ended by a person or by a latch; what was kept stays kept."""
