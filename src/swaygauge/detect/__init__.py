"""From how ranks and links moved to few alerts: one idea per file, the table in kinds.py, numbers in thresholds.py."""

from swaygauge.detect.alert import alert_key
from swaygauge.detect.inputs import NightInputs, in_degree, missing_nights
from swaygauge.detect.judge import detect
from swaygauge.detect.kinds import KINDS, Kind, order_alerts
from swaygauge.detect.ring import LeadingPair, Ring, is_lambda_jump, name_ring
from swaygauge.detect.state import DetectorState
from swaygauge.detect.thresholds import Thresholds

__all__ = [
    "KINDS",
    "DetectorState",
    "Kind",
    "LeadingPair",
    "NightInputs",
    "Ring",
    "Thresholds",
    "alert_key",
    "detect",
    "in_degree",
    "is_lambda_jump",
    "missing_nights",
    "name_ring",
    "order_alerts",
]
