"""The gate of large questions, by threads."""

from __future__ import annotations

import threading
import time

import pytest

from gasapi.web.problems import Problem
from gasapi.web.turns import Gate, Share, Ticket, wished_wait


def far() -> float:
    return time.monotonic() + 20.0


@pytest.mark.parametrize(
    ("field", "seconds"),
    [
        ("", None),
        ("respond-async", None),
        ("wait=2", 2.0),
        ("Wait = 10", 10.0),
        ('respond-async, wait="5"', 5.0),
        ("handling=lenient; wait=3", 3.0),
        ("wait=999999999", 3600.0),
        ("wait=-1", None),
        ("wait=1.5", None),
        ("await=2", None),
        ("wait=soon", None),
    ],
)
def test_the_wish_to_wait_is_read(field, seconds):
    """RFC 7240, section 4.3: whole seconds; what is not understood is not heeded."""
    assert seconds == wished_wait(field)


def test_so_many_pass_and_the_others_wait_in_order():
    """One is inside, the rest come in the order in which they stood in line, each when one leaves."""
    gate = Gate(Share(active=1, waiting=10))
    order: list[int] = []
    gate.enter(far())
    threads = []
    for number in range(5):
        thread = threading.Thread(target=lambda n=number: (gate.enter(far()), order.append(n), gate.leave()))
        thread.start()
        threads.append(thread)
        while gate.waiting <= number:
            time.sleep(0.001)
    assert [] == order
    gate.leave()
    for thread in threads:
        thread.join(10.0)
    assert [0, 1, 2, 3, 4] == order
    gate.enter(time.monotonic())
    with pytest.raises(Problem):
        gate.enter(time.monotonic())


def test_a_full_line_and_a_long_wait_are_told():
    """503 with Retry-After, at once where the line is full; who gave up stands in line no longer."""
    gate = Gate(Share(active=1, waiting=1))
    gate.enter(far())
    start = time.monotonic()
    with pytest.raises(Problem) as late:
        gate.enter(start + 0.05)
    assert (503, (("Retry-After", "1"),)) == (late.value.status, late.value.headers)
    assert 0 == gate.waiting
    waiting = threading.Thread(target=lambda: (gate.enter(far()), gate.leave()))
    waiting.start()
    while not gate.is_full:
        time.sleep(0.001)
    with pytest.raises(Problem, match="wait already"):
        gate.enter(far())
    gate.leave()
    waiting.join(10.0)
    gate.enter(time.monotonic())


def test_many_threads_leave_the_gate_as_it_was():
    """400 passages by 8 threads, some of which give up: never more than two inside, and all places free in the end."""
    gate = Gate(Share(active=2, waiting=100))
    lock, inside, most, passed = threading.Lock(), 0, 0, 0

    def pass_often(seed: int) -> None:
        nonlocal inside, most, passed
        for n in range(50):
            try:
                gate.enter(time.monotonic() + (0.0 if (n + seed) % 5 == 0 else 20.0))
            except Problem:
                continue
            with lock:
                inside += 1
                most, passed = max(most, inside), passed + 1
            time.sleep(0.0002)
            with lock:
                inside -= 1
            gate.leave()

    threads = [threading.Thread(target=pass_often, args=(seed,)) for seed in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(30.0)
    assert 2 == most
    assert passed >= 320
    assert 0 == gate.waiting
    gate.enter(time.monotonic())
    gate.enter(time.monotonic())


def test_bytes_are_given_back():
    """A body beyond the common bound is refused; what a ticket held is free again when it closes, twice or not."""
    gate = Gate(Share(body_bytes=100))
    first, second = Ticket(gate), Ticket(gate)
    first.hold(60)
    with pytest.raises(Problem):
        second.hold(60)
    second.hold(40)
    first.close()
    first.close()
    second.hold(60)
    second.close()
    Ticket(gate).hold(100)


def test_blocks_hold_the_gate_one_at_a_time():
    """An answer that leaves in blocks is inside while a block is made and outside while it is sent; its end closes all."""
    gate = Gate(Share(active=1, waiting=0))
    ticket = Ticket(gate)
    ticket.hold(10)
    ticket.enter()
    closed = []

    class Body:
        def __iter__(self):
            for block in (b"a", b"b"):
                with pytest.raises(Problem):
                    gate.enter(time.monotonic())
                yield block

        def close(self):
            closed.append(True)

    blocks = ticket.blocks(Body())
    assert b"a" == next(blocks)
    gate.enter(time.monotonic())
    gate.leave()
    assert [b"b"] == list(blocks)
    blocks.close()
    assert [True] == closed
    gate.enter(time.monotonic())
    gate.hold(gate.share.body_bytes)


def test_time_over():
    """The clock is looked at when asked for; the client's wish counts where it is shorter than the common bound."""
    Ticket(Gate(Share(seconds=20.0)), 30.0).check()
    hurried = Ticket(Gate(Share(seconds=20.0)), 0.0)
    time.sleep(0.001)
    with pytest.raises(Problem) as over:
        hurried.check()
    assert 503 == over.value.status
