"""What is scored: the raw snapshot plus the links that are missing for reasons of the crawl.

The state is a pure function of the accepted snapshots and their verdicts, so replaying them gives the same bytes.

* :func:`start_book`: the first night, which is scored as it is.
* :func:`advance`: every later night.
* :func:`comparable_before`: last night, as it would have looked with tonight's coverage.
"""

from __future__ import annotations

from swaygauge.effective.absence import UpkeepOptions
from swaygauge.effective.book import advance, start_book
from swaygauge.effective.coverage import comparable_before

__all__ = ["UpkeepOptions", "advance", "comparable_before", "start_book"]
