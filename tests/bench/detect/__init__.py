"""The detector against planted truth: three networks, two models of natural change, an imperfect crawl.

``python -m bench.detect`` with ``tests`` on the path; see ``--help``. The worlds come from the demo's generator, whose
folder joins the path here.
"""

import sys
from pathlib import Path

DEMO = Path(__file__).parents[3] / "demo_data"
if str(DEMO) not in sys.path:
    sys.path.insert(0, str(DEMO))
