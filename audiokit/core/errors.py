"""Errors a user sees. Each says what is wrong and how to mend it."""


class AudiokitError(Exception):
    """A problem the user can mend; the command line prints it and exits with 2.

    message : what was found, naming file, row, column and value where they are known.
    mend    : what to do about it.
    """

    def __init__(self, message: str, mend: str = "") -> None:
        super().__init__(message)
        self.message = message
        self.mend = mend

    def __str__(self) -> str:
        return f"{self.message}\n  mend: {self.mend}" if self.mend else self.message


class CohortError(AudiokitError):
    """The cohort cannot be read: missing file, unknown setting, unreadable table."""


class RuleFileError(AudiokitError):
    """A rule file breaks its own grammar."""


class DecisionError(AudiokitError):
    """A decision cannot be recorded or the decisions file cannot be read."""


class OutputError(AudiokitError):
    """The output folder cannot be written."""


class OutOfScopeError(AudiokitError):
    """A published table or formula was asked for something outside its stated limits."""
