"""What can go wrong, as one small tree.

BemwaveError            anything bemwave raises on purpose; carries the command's exit code
  InputError            the case, a mesh or the command line is wrong (exit 2)
  NotYetError           asked for something that a later version brings (exit 2)
  MissingLibraryError   a system library is not installed (exit 2); the text has the install line
  RunError              the run could not go on (exit 3)

Every message says what was given, what was expected, where, and what to do.
"""

from __future__ import annotations


class BemwaveError(Exception):
    """Base of all errors raised on purpose; `exit_code` is what the command line returns."""

    exit_code = 2


class InputError(BemwaveError):
    """The input is wrong: a case, a mesh, a table or the command line."""


class NotYetError(BemwaveError):
    """A thing the case format knows and this version does not do."""


class MissingLibraryError(BemwaveError):
    """A system library that an optional part needs cannot be loaded."""


class RunError(BemwaveError):
    """The run could not go on; what was written so far stays readable."""

    exit_code = 3
