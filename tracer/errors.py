"""Errors that a user meets, each with the exit code that the command line gives it."""


class TracerError(Exception):
    """Anything that ends a command with one clear message; exit code 1."""

    exit_code = 1


class InputError(TracerError):
    """Input that cannot be used: says file, key or row, the value, and what is allowed; exit code 2."""

    exit_code = 2


class Interrupted(TracerError):
    """The user stopped the work; exit code 3."""

    exit_code = 3
