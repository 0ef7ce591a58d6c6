"""Signals during a run: noted, obeyed by whoever asks, and left as they were."""

from __future__ import annotations

import os
import signal
import threading
import time

import pytest

from bemwave.running.interrupts import heard


def interrupted_twice(number: signal.Signals) -> None:
    with heard() as came:
        assert not came()
        os.kill(os.getpid(), number)
        time.sleep(0.01)
        assert came()
        os.kill(os.getpid(), number)
        time.sleep(1.0)


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_the_first_is_noted_and_the_second_breaks_off(
    number: signal.Signals, request: pytest.FixtureRequest
) -> None:
    def before(number: int, frame: object) -> None:
        raise AssertionError("the handler that was there before was called")

    # not whatever there is: a shell's background jobs, a CI's perhaps, ignore Ctrl-C
    own = signal.signal(number, before)
    request.addfinalizer(lambda: signal.signal(number, own))
    with pytest.raises(KeyboardInterrupt):
        interrupted_twice(number)
    assert signal.getsignal(number) is before


def test_what_was_ignored_stays_ignored() -> None:
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        with heard() as came:
            os.kill(os.getpid(), signal.SIGINT)
            time.sleep(0.01)
            assert not came()
        assert signal.getsignal(signal.SIGINT) is signal.SIG_IGN
    finally:
        signal.signal(signal.SIGINT, before)


def test_outside_the_main_thread_nothing_changes() -> None:
    before, told = signal.getsignal(signal.SIGINT), []

    def work() -> None:
        with heard() as came:
            told.append((came(), signal.getsignal(signal.SIGINT) is before))

    thread = threading.Thread(target=work)
    thread.start()
    thread.join()
    assert told == [(False, True)]
