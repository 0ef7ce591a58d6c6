"""Checks: verdicts on a run, each with its figure, its limit and where the limit comes from."""

from bemwave.checks.verdicts import judge

__all__ = ["judge"]
