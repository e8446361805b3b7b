"""Plain eigenvector centrality: lambda x = A'x. A diagnostic only.

Bonacich 1972, "Factoring and weighting approaches to status scores and clique identification", J. Math. Sociol. 2(1).
On a network that is not strongly connected it is 0 on everything that the leading component does not reach, endorsed
or not, and it does not exist without a cycle; :mod:`leaks` counts what that costs.
"""

from __future__ import annotations

import numpy as np

from swaygauge.graph import Graph
from swaygauge.records import Floats
from swaygauge.scores.spectrum import leading_right


def eigenvector(graph: Graph) -> Floats:
    """(n,) eigenvector centrality by node, of Euclidean length 1; all 0 when the network has no cycle.

    Raises ScoreError when values leave the range of floating-point numbers.

    >>> eigenvector(Graph(3, [0, 1, 1], [1, 0, 2])).round(4).tolist()
    [0.5774, 0.5774, 0.5774]
    >>> eigenvector(Graph(3, [0, 1], [1, 2])).tolist()
    [0.0, 0.0, 0.0]
    """
    value = leading_right(graph)
    length = float(np.sqrt(np.sum(value * value)))
    return value / length if length > 0.0 else value
