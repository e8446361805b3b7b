import numpy as np
import pytest

from swaygauge.detect.cusum import step_down, step_up

# NIST/SEMATECH e-Handbook 6.3.2.3: twenty group means; target 325, sigma of the means .635, k = .3175, h = 4.1959 in
# the units of the data (k = .5 and h = 6.608 standard deviations)
MEANS = [324.925, 324.675, 324.725, 324.350, 325.350, 325.225, 324.125, 324.525, 325.225, 324.600]
MEANS += [324.625, 325.150, 328.325, 327.250, 327.825, 328.500, 326.675, 327.775, 326.875, 328.350]
UPPER = [0, 0, 0, 0, 0.03, 0, 0, 0, 0, 0, 0, 0, 3.01, 4.94, 7.45, 10.63, 11.99, 14.44, 16.00, 19.04]
LOWER = [0, 0.01, 0, 0.33, 0, 0, 0.56, 0.72, 0.17, 0.25, 0.31, 0, 0, 0, 0, 0, 0, 0, 0, 0]
SIGMA, ALLOWANCE, LIMIT = 0.635, 0.3175, 4.1959


@pytest.mark.parametrize("unit", [1.0, SIGMA])
def test_nist_table(unit: float) -> None:
    upper, lower = np.zeros(1), np.zeros(1)
    uppers, lowers = [], []
    for mean in MEANS:
        z = np.array([(mean - 325.0) / unit])
        upper = step_up(upper, z, allowance=ALLOWANCE / unit)
        lower = step_down(lower, z, allowance=ALLOWANCE / unit)
        uppers.append(float(upper[0]) * unit)
        lowers.append(float(lower[0]) * unit)
    assert uppers == pytest.approx(UPPER, abs=0.0051)
    assert lowers == pytest.approx(LOWER, abs=0.0051)
    assert next(at for at, total in enumerate(uppers, 1) if total > LIMIT) == 14
