"""The error that a user can mend."""

from __future__ import annotations


class UserError(Exception):
    """Something that the user can put right: wrong usage, an unreadable input, an unwritable output.

    The message says in one line what is wrong, where, and how to mend it. The command line prints it without
    a traceback and ends with status 2.

    Parameters
    ----------
    message : str
        The line; what it quotes from a file cannot break it or steer the terminal.
    """

    exit_status = 2

    def __init__(self, message: str) -> None:
        super().__init__("".join(c if c.isprintable() else "?" for c in message))
