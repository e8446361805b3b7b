"""Where plain eigenvector centrality loses its mass: the strong components, and who is left at zero."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from swaygauge.graph import Graph
from swaygauge.kernels import spreading
from swaygauge.records import Flags, Ids, Ints, SpectralBounds, frozen
from swaygauge.scores.spectrum import bound_lambda, leading_components


@dataclass(frozen=True, eq=False)
class LeakReport:
    """The strongly connected structure of one night. Shares are of all nodes, in [0, 1]."""

    components: int  # strong components
    nontrivial: int  # of those, with more than one node
    largest: int  # nodes in the largest one
    upstream_share: float  # nodes outside the largest component that reach it
    downstream_share: float  # nodes outside the largest component that it reaches
    zeroed_count: int  # endorsed nodes whose eigenvector score is zero
    lambda_lower: float  # proven; both exactly 0 when the network has no cycle: then every score is zero
    lambda_upper: float
    ids: Ids  # (k,) the most endorsed of the zeroed nodes, by falling in-degree
    in_degree: Ints  # (k,) how many links end at each of them

    def with_ids(self, ids: Ids) -> LeakReport:
        """The same report with node i named by ids[i]."""
        return replace(self, ids=frozen(ids[self.ids].astype(np.int32)))


def leak_report(graph: Graph, *, bounds: SpectralBounds | None = None, named: int = 1000) -> LeakReport:
    """Count and name what eigenvector centrality leaves at zero, exactly, from the structure alone.

    A node scores above zero only on a component that attains lambda, the last such in line, or downstream of it. At
    most ``named`` nodes are listed, all are counted.

    >>> report = leak_report(Graph(4, [0, 1, 2], [1, 2, 3]))
    >>> report.zeroed_count, report.ids.tolist(), report.lambda_upper
    (3, [1, 2, 3], 0.0)
    """
    bounds = bound_lambda(graph) if bounds is None else bounds
    rows, size = graph.rows, graph.component_sizes()
    degree = graph.in_degree()
    fed = _downstream(graph, leading_components(graph))[graph.place]
    zeroed = np.flatnonzero(~fed & (degree > 0))
    listed = zeroed[np.argsort(-degree[zeroed], kind="stable")][:named]
    upstream = downstream = 0.0
    if graph.n:
        big = int(np.argmax(size))
        above = _marked(graph, np.array([big]))
        spreading.mark_upstream(rows.start, rows.source, rows.component_start, above)
        upstream = float(above.sum() - size[big]) / graph.n
        downstream = float(_downstream(graph, np.array([big])).sum() - size[big]) / graph.n
    return LeakReport(
        components=graph.component_count,
        nontrivial=int((size > 1).sum()),
        largest=int(size.max()) if graph.n else 0,
        upstream_share=upstream,
        downstream_share=downstream,
        zeroed_count=len(zeroed),
        lambda_lower=bounds.lower,
        lambda_upper=bounds.upper,
        ids=frozen(listed.astype(np.int32)),
        in_degree=frozen(degree[listed].astype(np.int64)),
    )


def _marked(graph: Graph, chosen: Ints) -> Flags:
    """(n,) by position: True on some components."""
    mark = np.zeros(graph.n, np.bool_)
    for component in chosen:
        low, high = graph.rows.component_start[component : component + 2]
        mark[low:high] = True
    return mark


def _downstream(graph: Graph, chosen: Ints) -> Flags:
    """(n,) by position: some components and what they reach."""
    mark = _marked(graph, chosen)
    rows = graph.rows
    spreading.mark_downstream(rows.start, rows.source, rows.component_start, mark)
    return mark
