"""The generator lives beside the data, outside the package; its folder joins the path here."""

from __future__ import annotations

import sys
from pathlib import Path

DEMO = Path(__file__).parents[2] / "demo_data"
if str(DEMO) not in sys.path:
    sys.path.insert(0, str(DEMO))
