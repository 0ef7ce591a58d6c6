"""What the user asks: the model of a case, the TOML reader, the starter case."""

from bemwave.case.later import refuse_not_yet
from bemwave.case.model import Case
from bemwave.case.reader import read_case

__all__ = ["Case", "read_case", "refuse_not_yet"]
