"""Running: from a case to a finished run folder, or to a plan of one."""

from bemwave.running.check import check
from bemwave.running.live import LiveState, steps
from bemwave.running.loop import run
from bemwave.running.plan import plan

__all__ = ["LiveState", "check", "plan", "run", "steps"]
