"""Turns every way a command can fail into one line on stderr and an exit status, never a traceback."""

import contextlib
import errno
import logging
import os
import sys
from collections.abc import Callable
from types import TracebackType
from typing import TextIO

import click

from wattproof.core.errors import WattproofError

NAME = "wattproof"
OK = 0
UNEXPECTED = 1
WRONG_USE = 2
INTERRUPTED = 130  # 128 + SIGINT, as shells report it (POSIX.1-2017, XCU 2.8.2)
_OUTPUT_LOST = {errno.EPIPE, errno.ENOSPC, errno.EBADF} | ({errno.EINVAL} if os.name == "nt" else set())
_log = logging.getLogger(__name__)

OpenLog = Callable[[], str]


def guarded(action: Callable[[], int], open_log: OpenLog) -> int:
    """Run an action and return its exit status; whatever it raises becomes one line on stderr and a status.

    `open_log` makes the log file ready and returns its path, or an empty text where it cannot be written; it is called
    only for an error that nobody foresaw.
    """
    _let_any_text_out()
    try:
        status = action()
        _flush(sys.stdout)
    except (click.ClickException, WattproofError) as error:
        status = _fail(_said(error), WRONG_USE)
    except (KeyboardInterrupt, click.Abort):
        status = _fail("stopped by the keyboard", INTERRUPTED)
    except Exception as error:  # noqa: BLE001 - the last stop before a person: they get one line, the log the rest
        status = _output_lost(error) if _concerns_output(error) else _unforeseen(error, open_log)
    return status


def usage_line(error: click.UsageError) -> str:
    """Return a usage error in one line: the command, the option or argument, what is wrong, and the way out."""
    command = error.ctx.command_path.removeprefix(NAME).strip() if error.ctx is not None else ""
    parts = [command, *_what_is_wrong(error)]
    line = ": ".join(part for part in parts if part)
    if isinstance(error, click.BadParameter) and not isinstance(error, click.MissingParameter):
        return line
    return f"{line}; see {f'{NAME} {command}'.strip()} --help"


def one_line(text: str) -> str:
    """Return a text without line breaks or other control characters."""
    return "".join(char if char.isprintable() else ascii(char)[1:-1] for char in " ".join(text.split()))


def complain(text: str) -> None:
    """Write one line to stderr, whatever characters it holds and whether or not anybody listens."""
    if sys.stderr is None:
        return
    with contextlib.suppress(OSError, ValueError):
        sys.stderr.write(f"{NAME}: {one_line(text)}\n")
        sys.stderr.flush()


def unforeseen_hook(open_log: OpenLog) -> Callable[[type[BaseException], BaseException, TracebackType | None], None]:
    """Return a `sys.excepthook` for a window: one line on stderr, the rest in the log."""

    def hook(kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        if isinstance(error, Exception):
            _unforeseen(error, open_log)
        else:
            sys.__excepthook__(kind, error, trace)

    return hook


def _what_is_wrong(error: click.UsageError) -> tuple[str, ...]:
    message = error.format_message()
    if isinstance(error, click.MissingParameter):
        return (f"{_named(error)} is missing",)
    if isinstance(error, click.BadParameter):
        message = error.message
        return (_named(error), _without_stop(message))
    return (_without_stop(message),)


def _named(error: click.BadParameter) -> str:
    param = error.param
    if param is None:
        return str(error.param_hint or "")
    return param.opts[0] if isinstance(param, click.Option) else param.human_readable_name


def _without_stop(message: str) -> str:
    message = message.strip().removesuffix(".")
    return message[:1].lower() + message[1:] if message[:2].istitle() else message


def _said(error: Exception) -> str:
    if isinstance(error, click.UsageError):
        return usage_line(error)
    return error.format_message() if isinstance(error, click.ClickException) else str(error)


def _concerns_output(error: Exception) -> bool:
    return isinstance(error, OSError) and error.filename is None and error.errno in _OUTPUT_LOST


def _output_lost(error: Exception) -> int:
    _let_go_of_output()
    reason = error.strerror if isinstance(error, OSError) and error.strerror else "cannot be written"
    said = "closed by its reader" if isinstance(error, BrokenPipeError) else reason
    return _fail(f"standard output: {said.lower()}; give it a file or a program that takes all of it", WRONG_USE)


def _unforeseen(error: Exception, open_log: OpenLog) -> int:
    path = open_log()
    _log.critical("unforeseen error", exc_info=error)
    where = f"the details are in {path}" if path else "no log file could be written"
    return _fail(f"unforeseen {type(error).__name__}: {error}; {where}", UNEXPECTED)


def _fail(text: str, status: int) -> int:
    with contextlib.suppress(OSError, ValueError):
        _flush(sys.stdout)
    complain(text)
    return status


def _flush(stream: TextIO | None) -> None:
    if stream is not None:
        stream.flush()


def _let_go_of_output() -> None:
    """Point stdout nowhere, so that Python's own flush at exit has nothing left to complain of."""
    with contextlib.suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
        os.close(nowhere)


def _let_any_text_out() -> None:
    """Let a character that the terminal cannot show come out as its escape, where it would raise an error."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
