"""Whether a window can be opened here, asked before Qt is: Qt's own answer is to abort."""

from __future__ import annotations

import ctypes
import os
import sys

# Shared library, and the Debian package that brings it.
_DRAWING = (
    ("libEGL.so.1", "libegl1"),
    ("libGL.so.1", "libgl1"),
    ("libxkbcommon.so.0", "libxkbcommon0"),
    ("libfontconfig.so.1", "libfontconfig1"),
    ("libdbus-1.so.3", "libdbus-1-3"),
    ("libglib-2.0.so.0", "libglib2.0-0"),
)
_X11 = (
    ("libX11-xcb.so.1", "libx11-xcb1"),
    ("libxcb-cursor.so.0", "libxcb-cursor0"),
    ("libxcb-icccm.so.4", "libxcb-icccm4"),
    ("libxcb-image.so.0", "libxcb-image0"),
    ("libxcb-keysyms.so.1", "libxcb-keysyms1"),
    ("libxcb-randr.so.0", "libxcb-randr0"),
    ("libxcb-render-util.so.0", "libxcb-render-util0"),
    ("libxcb-shape.so.0", "libxcb-shape0"),
    ("libxcb-xkb.so.1", "libxcb-xkb1"),
    ("libxkbcommon-x11.so.0", "libxkbcommon-x11-0"),
)


def there_is_a_screen() -> bool:
    """Whether this process has a display, or was told how to draw without one."""
    if not sys.platform.startswith("linux"):
        return True
    return bool(
        os.environ.get("QT_QPA_PLATFORM")
        or os.environ.get("DISPLAY")
        or os.environ.get("WAYLAND_DISPLAY")
    )


def missing_libraries(on_screen: bool) -> str:
    """A sentence naming the system libraries Qt would miss, "" when it has all.

    Parameters
    ----------
    on_screen : bool
        Whether a window is wanted; drawing into memory needs fewer libraries.
    """
    if not sys.platform.startswith("linux"):
        return ""
    wanted = list(_DRAWING)
    platform = os.environ.get("QT_QPA_PLATFORM", "")
    if on_screen and (platform.startswith("xcb") or (not platform and os.environ.get("DISPLAY"))):
        wanted += _X11
    absent = [(library, package) for library, package in wanted if not _loads(library)]
    if not absent:
        return ""
    libraries = ", ".join(library for library, _ in absent)
    packages = " ".join(dict.fromkeys(package for _, package in absent))
    word = "library" if len(absent) == 1 else "libraries"
    return (
        f"The window needs the system {word} {libraries}. "
        f"On Debian or Ubuntu: apt-get install {packages}"
    )


def _loads(library: str) -> bool:
    try:
        ctypes.CDLL(library)
    except OSError:
        return False
    return True
