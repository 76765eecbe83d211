"""One family of errors; each is a single line that says what, where and what to do."""

from __future__ import annotations


class UnitclassError(Exception):
    """Base of every error the program expects; `exit_code` is what the shell sees.

    Parameters
    ----------
    what : str
        What is wrong, in plain words.
    where : str
        File, unit or option that it is about; empty when the message names it already.
    remedy : str
        What the user can do next.
    """

    exit_code = 1

    def __init__(self, what: str, *, where: str = "", remedy: str = "") -> None:
        self.what = what
        self.where = where
        self.remedy = remedy
        super().__init__(what, where, remedy)

    def __str__(self) -> str:
        head = f"{self.where}: {self.what}" if self.where else self.what
        line = f"{head}; {self.remedy}" if self.remedy else head
        return " ".join(line.split())

    def __reduce__(self) -> tuple[object, ...]:
        """Travel between processes with the keyword arguments intact."""
        return (_rebuilt, (type(self), self.what, self.where, self.remedy))


def _rebuilt(kind: type[UnitclassError], what: str, where: str, remedy: str) -> UnitclassError:
    return kind(what, where=where, remedy=remedy)


class UsageError(UnitclassError):
    """The command line or a settings file asks for something that cannot be."""

    exit_code = 2


class FileError(UnitclassError):
    """A file cannot be read, or holds nothing this program can use."""

    exit_code = 1


class TargetError(UnitclassError):
    """A result cannot be written where the user wants it."""

    exit_code = 1


class NoUsableFileError(UnitclassError):
    """None of the named files was usable."""

    exit_code = 3


class SignalError(UnitclassError):
    """A nerve or membrane potential is there but cannot be analysed."""

    exit_code = 1
