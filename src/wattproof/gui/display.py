"""Finds, before Qt is imported, what keeps a window from opening on this machine: Qt itself would abort."""

import ctypes
import os
import socket
import sys
from collections.abc import Mapping
from pathlib import Path

# Shared libraries that the Qt wheel loads at run time, and the Debian 12 package that brings each.
_EVERYWHERE = {
    "libEGL.so.1": "libegl1",
    "libGL.so.1": "libgl1",
    "libdbus-1.so.3": "libdbus-1-3",
    "libfontconfig.so.1": "libfontconfig1",
    "libglib-2.0.so.0": "libglib2.0-0",
}
_UNDER_X = {
    "libxcb.so.1": "libxcb1",
    "libxkbcommon-x11.so.0": "libxkbcommon-x11-0",
    "libxcb-cursor.so.0": "libxcb-cursor0",
    "libxcb-icccm.so.4": "libxcb-icccm4",
    "libxcb-keysyms.so.1": "libxcb-keysyms1",
    "libxcb-shape.so.0": "libxcb-shape0",
    "libxcb-xkb.so.1": "libxcb-xkb1",
}
_WITHOUT_SCREEN = ("offscreen", "minimal", "vnc")  # Qt platforms that need no display server
_X_TCP_PORT = 6000  # display 0 of a remote X server (X Window System Protocol, appendix B)
_PATIENCE_S = 2.0
_WAY_OUT = "open it from a desktop session, or read recordings with `wattproof read FILE`"


def missing_display_reason(environment: Mapping[str, str] | None = None) -> str | None:
    """Return one line that names what is missing and the way out, or None where a window can open."""
    if not sys.platform.startswith("linux"):
        return None
    env = os.environ if environment is None else environment
    platform = env.get("QT_QPA_PLATFORM", "").split(":")[0].split(";")[0]
    if platform in _WITHOUT_SCREEN:
        return _missing_libraries(_EVERYWHERE)
    wayland = _wayland_answers(env)
    if not wayland and not env.get("DISPLAY"):
        return f"no display: neither DISPLAY nor WAYLAND_DISPLAY leads to a screen; {_WAY_OUT}"
    if not wayland and not _x_answers(env["DISPLAY"]):
        return f"no display: nothing at DISPLAY={env['DISPLAY']} lets a program in; {_WAY_OUT}"
    return _missing_libraries(_EVERYWHERE if wayland else _EVERYWHERE | _UNDER_X)


def _missing_libraries(wanted: Mapping[str, str]) -> str | None:
    missing = [library for library in wanted if not _loads(library)]
    if not missing:
        return None
    packages = " ".join(wanted[library] for library in missing)
    return f"the window needs {', '.join(missing)}; on Debian or Ubuntu: sudo apt-get install {packages}"


def _loads(library: str) -> bool:
    try:
        ctypes.CDLL(library)
    except OSError:
        return False
    return True


def _wayland_answers(env: Mapping[str, str]) -> bool:
    name = env.get("WAYLAND_DISPLAY", "")
    if not name or env.get("QT_QPA_PLATFORM", "").startswith("xcb"):
        return False
    return _connects(str(Path(env.get("XDG_RUNTIME_DIR", "/")) / name))


def _x_answers(display: str) -> bool:
    host, _, rest = display.rpartition(":")
    number = rest.split(".")[0]
    if not number.isdigit():
        return False
    if host not in ("", "unix"):
        try:
            socket.create_connection((host.strip("[]"), _X_TCP_PORT + int(number)), _PATIENCE_S).close()
        except (OSError, OverflowError):
            return False
    return _x_lets_in(display)


def _x_lets_in(display: str) -> bool:
    """Return whether a server answers there and accepts us (libxcb: xcb_connect, xcb_connection_has_error)."""
    try:
        xcb = ctypes.CDLL("libxcb.so.1")
    except OSError:
        return True  # it is named with the other missing libraries
    xcb.xcb_connect.restype = ctypes.c_void_p
    xcb.xcb_connect.argtypes = (ctypes.c_char_p, ctypes.c_void_p)
    for call in (xcb.xcb_connection_has_error, xcb.xcb_disconnect):
        call.argtypes = (ctypes.c_void_p,)
    connection = xcb.xcb_connect(os.fsencode(display), None)
    try:
        return int(xcb.xcb_connection_has_error(connection)) == 0
    finally:
        xcb.xcb_disconnect(connection)


def _connects(address: str) -> bool:
    with socket.socket(socket.AF_UNIX, socket.SOCK_STREAM) as line:
        line.settimeout(_PATIENCE_S)
        try:
            line.connect(address)
        except (OSError, ValueError):
            return False
    return True
