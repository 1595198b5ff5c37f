"""The Qt binding must leave Python's own objects alone."""

import subprocess
import sys

COUNT = """
import sys
from PySide6.QtCore import QObject
thing = QObject()
before = sys.getrefcount(None)
for _ in range(500):
    thing.setObjectName("x")
print(before - sys.getrefcount(None))
"""


def test_calls_without_a_result_do_not_use_up_none():
    """PySide6 6.12.0 gives None away once a call on Python 3.11; the program aborts in minutes."""
    done = subprocess.run([sys.executable, "-c", COUNT], capture_output=True, text=True, check=True)
    assert int(done.stdout) < 100, "install PySide6-Essentials below 6.12 (or use Python 3.12)"
