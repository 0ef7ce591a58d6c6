"""Report: one page about a run, for people; it needs nothing but itself."""

from bemwave.report.page import write_report

__all__ = ["write_report"]
