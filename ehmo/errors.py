"""Errors that reach people: each names the place and the mend, on one line."""

from __future__ import annotations


def visible(text: str) -> str:
    r"""Text on one line with control characters shown, so that names from files cannot steer a terminal.

    Examples
    --------
    >>> visible("red \x1b[31m")
    'red \\x1b[31m'
    """
    return "".join(char if char.isprintable() else char.encode("unicode_escape").decode("ascii") for char in text)


class EhmoError(Exception):
    """Base of every error that ehmo raises on purpose.

    Parameters
    ----------
    fault : str
        What is wrong, in words.
    place : str, optional
        File, line, atom or option where it is wrong.
    mend : str, optional
        What the reader can do about it.
    """

    def __init__(self, fault: str, *, place: str = "", mend: str = "") -> None:
        super().__init__(fault)
        self.fault = fault
        self.place = place
        self.mend = mend

    def __str__(self) -> str:
        text = f"{self.place}: {self.fault}" if self.place else self.fault
        return visible(f"{text}; {self.mend}" if self.mend else text)


class InputError(EhmoError):
    """A file, a geometry or an option that cannot be used as given."""


class ParameterError(EhmoError):
    """A parameter set that cannot be read, or that lacks an element."""


class ElectronCountError(EhmoError):
    """Charge, unpaired electrons and atoms that do not fit together."""


class OverlapError(EhmoError):
    """Basis functions that are linearly dependent at this geometry."""


class LimitError(EhmoError):
    """A count over a stated limit; the message names the option that raises it."""


class ConvergenceError(EhmoError):
    """Charges that do not settle; such a calculation is never reported as a result."""


class MultipletError(EhmoError):
    """Terms or magnetism asked of a shell that has none to give, or more than are computed here."""


class BatchError(EhmoError):
    """A batch that cannot go on: its worker processes, or the cluster, are not to be had."""


class StoreError(EhmoError):
    """A store of results that cannot be opened, read or written."""
