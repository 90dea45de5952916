"""Who is there: asked until the answer is sure."""

from __future__ import annotations

from collections.abc import Callable

from benchtool.errors import ReplyError, Step
from benchtool_drivers.link.recovery import IDENTITY

N_QUESTIONS = 6
"""How often it is asked for; two answers in a row must be the same."""


def identify(resource: str, ask: Callable[[str], str], doubt: Callable[[], None]) -> str:
    """Ask an instrument who it is until it says the same twice: the first may be an old answer.

    Args:
        resource: The connection, as the user named it.
        ask: Asks, and returns a line of text.
        doubt: Is called where an answer shows that the connection is not in step.

    Raises:
        ReplyError: If it says something else each time.
    """
    earlier = ""
    odd: ReplyError | None = None
    for _ in range(N_QUESTIONS):
        try:
            answer = ask(IDENTITY)
        except ReplyError as error:
            answer, odd = "", error
        if answer and answer == earlier:
            return answer
        if earlier or not answer:
            doubt()
            answer = ""
        earlier = answer
    raise odd or ReplyError(
        f"{resource} answers {IDENTITY} otherwise each time.",
        hint="Is another program talking to the instrument at the same time?",
        step=Step(resource=resource, command=IDENTITY),
    )
