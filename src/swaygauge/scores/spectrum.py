"""lambda, the spectral radius of the network, between proven bounds.

lambda is the largest radius over the strong components. On one component, for any positive vector v, the smallest and
the largest quotient (A'v)_i / v_i enclose its radius: Collatz 1942, Math. Z. 48; Wielandt 1950, Math. Z. 52. Where the
vector comes from does not matter for the proof, only for how narrow the bracket is: power steps where they converge
fast, Arnoldi where they do not. Components that cannot hold the largest radius are dismissed by their degrees: no
radius exceeds the largest row sum or the largest column sum.
"""

from __future__ import annotations

from dataclasses import dataclass
from weakref import WeakKeyDictionary

import numpy as np

from swaygauge.errors import ScoreError
from swaygauge.graph import NO_WEIGHT, Block, Graph, Rows
from swaygauge.kernels import spreading, sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats, Ints, SpectralBounds
from swaygauge.scores.krylov import DENSE, improved
from swaygauge.scores.proof import ROUNDING
from swaygauge.scores.solve import System, carry_on

SMALL_LINKS = 20_000  # components up to this many links are bracketed in one compiled loop
SMALL_SWEEPS = 60
PATIENT_SWEEPS = 22  # power steps that are worth waiting for before the next Arnoldi run
ROUNDS = 6  # Arnoldi runs at most; the bracket is proven whatever they achieve
GAP = 1e-6  # relative width of the bracket that is aimed at


@dataclass(frozen=True, eq=False)
class Brackets:
    """Per component that could hold lambda: its number and the proven bracket on its radius; upstream first."""

    component: Ints
    lower: Floats
    upper: Floats


@dataclass(frozen=True, eq=False)
class LeadingVectors:
    """A' right = lambda right and A left = lambda left, by node, non-negative, largest entry 1; all 0 when acyclic."""

    right: Floats
    left: Floats
    component: int  # the most downstream component that attains lambda; -1 when acyclic


def bound_lambda(graph: Graph, *, gap: float = GAP) -> SpectralBounds:
    """Proven bounds on the spectral radius of the links matrix; both exactly 0 when the network has no cycle.

    ``gap`` is the relative width that is aimed at. The bounds hold whether or not it is reached.

    >>> bounds = bound_lambda(Graph(3, [0, 1, 2], [1, 2, 0]))  # a ring
    >>> bounds.lower <= 1.0 <= bounds.upper, round(bounds.upper - bounds.lower, 9)
    (True, 0.0)
    """
    brackets = _brackets(graph, gap)
    if len(brackets.component) == 0:
        return SpectralBounds(0.0, 0.0)
    return SpectralBounds(float(brackets.lower.max()), float(brackets.upper.max()), int(brackets.component[-1]))


def leading_components(graph: Graph) -> Ints:
    """Components that attain lambda, as far as bounds can tell, and reach no other such; upstream first.

    Eigenvector centrality is above 0 on them and downstream of them, and nowhere else. Empty when acyclic.
    """
    return _last_in_line(graph.rows, _brackets(graph, GAP).component)


def leading_vectors(graph: Graph, *, gap: float = 1e-9) -> LeadingVectors:
    """The leading eigenvectors of the whole network. Not proven; good for telling what carries lambda.

    ``right`` (eigenvector centrality) is 0 except on components that attain lambda and what they reach; ``left`` is 0
    except on those and what reaches them. Where one such component reaches another, right stands on the last of them
    and left on the first. Components that tie side by side are given the same largest entry.
    """
    tied = _brackets(graph, GAP).component
    if len(tied) == 0:
        return LeadingVectors(np.zeros(graph.n), np.zeros(graph.n), -1)
    left = _spread(graph.turned, graph.component_count - 1 - tied[::-1], gap)[::-1]
    return LeadingVectors(leading_right(graph, gap=gap), left[graph.place], int(tied[-1]))


def leading_right(graph: Graph, *, gap: float = 1e-9) -> Floats:
    """``right`` of :func:`leading_vectors`, without the cost of ``left``."""
    tied = _brackets(graph, GAP).component
    return _spread(graph.rows, tied, gap)[graph.place] if len(tied) else np.zeros(graph.n)


def _last_in_line(rows: Rows, components: Ints) -> Ints:
    count = len(rows.component_start) - 1
    chosen, last = np.zeros(count, np.bool_), np.zeros(count, np.bool_)
    chosen[components] = True
    spreading.last_in_line(rows.start, rows.source, rows.component_start, chosen, last)
    return np.flatnonzero(last).astype(np.int64)


def _brackets(graph: Graph, gap: float) -> Brackets:
    """The brackets of a graph, kept as long as the graph is: alpha, refusals, vectors and leaks all ask for them."""
    known = _KNOWN.setdefault(graph, {})
    if gap not in known:
        known[gap] = _find_brackets(graph.rows, gap)
    return known[gap]


def _find_brackets(rows: Rows, gap: float) -> Brackets:
    size = np.diff(rows.component_start)
    loops, loop_radius = _self_links(rows, size)
    several = np.flatnonzero(size > 1)
    ceiling = _ceilings(rows, several) if len(several) else np.empty(0)
    order = np.argsort(-ceiling, kind="stable")
    several, ceiling = several[order].astype(np.int64), ceiling[order]
    lower, upper = np.zeros(len(several)), ceiling.copy()
    best = float(loop_radius.max()) if len(loop_radius) else 0.0
    first, last = rows.component_start[several], rows.component_start[several + 1]
    big = np.flatnonzero(rows.start[last] - rows.start[first] > SMALL_LINKS)
    for k in big:
        if ceiling[k] >= best:
            lower[k], upper[k], _ = _bracket(rows, rows.block(int(several[k])), gap, enough=best)
            best = max(best, lower[k])
    best = spreading.bracket_small(
        rows.start,
        rows.source,
        rows.weight,
        rows.component_start,
        several,
        ceiling,
        best,
        gap,
        2.0**-52,
        SMALL_LINKS,
        SMALL_SWEEPS,
        lower,
        upper,
    )
    for k in np.flatnonzero((upper >= best) & (upper - lower > gap * lower)):
        if upper[k] >= best:
            closer = _bracket(rows, rows.block(int(several[k])), gap, enough=best)
            lower[k], upper[k] = max(lower[k], closer[0]), min(upper[k], closer[1])
            best = max(best, lower[k])
    every = Brackets(
        np.concatenate((several, loops)), np.concatenate((lower, loop_radius)), np.concatenate((upper, loop_radius))
    )
    keep = np.flatnonzero(every.upper >= best)
    keep = keep[np.argsort(every.component[keep])]
    return Brackets(every.component[keep], every.lower[keep], every.upper[keep])


def _self_links(rows: Rows, size: Ints) -> tuple[Ints, Floats]:
    """Single-node components that link to themselves, and the weights of those links: their radius, exactly."""
    single = np.flatnonzero(size == 1)
    row = rows.component_start[single]
    last = rows.start[row + 1] - 1
    looped = (last >= rows.start[row]) & (rows.source[np.maximum(last, 0)] == row) if len(rows.source) else row < 0
    weight = rows.weight[last[looped]] if len(rows.weight) else np.ones(int(looped.sum()))
    return single[looped].astype(np.int64), weight


def _ceilings(rows: Rows, chosen: Ints) -> Floats:
    """The smaller of the largest row sum and the largest column sum of each component, outside links included."""
    weighted = len(rows.weight) > 0
    into: Floats = np.diff(rows.start).astype(np.float64)
    if weighted:
        into = np.bincount(np.repeat(np.arange(rows.n), np.diff(rows.start)), rows.weight, rows.n).astype(np.float64)
    out = np.bincount(rows.source, rows.weight if weighted else None, minlength=rows.n).astype(np.float64)
    starts = rows.component_start[:-1]
    ceiling = np.minimum(np.maximum.reduceat(into, starts), np.maximum.reduceat(out, starts))
    return ceiling[chosen] * (1.0 + 1e-9 * weighted)


def _bracket(rows: Rows, block: Block, gap: float, *, enough: float) -> tuple[float, float, Floats]:
    """Bracket on the radius of one component, stopping early once it is below ``enough``; and the vector behind it."""
    size = block.high - block.low
    lower, upper = 0.0, np.inf
    v = _first_guess(rows, block)
    image, totals = np.empty(size), np.zeros((len(block.cuts) - 1, 4))
    shift = 0.0
    for turn in range(ROUNDS + 1):
        width = np.inf
        for step in range(10 * PATIENT_SWEEPS):
            in_parts(
                sweeping.power,
                block.cuts,
                rows.start,
                block.inner,
                rows.source,
                rows.weight,
                v,
                block.low,
                shift,
                image,
                totals,
            )
            least, most, top = float(totals[:, 0].min()), float(totals[:, 1].max()), float(totals[:, 2].max())
            if least == least and most == most:
                lower = max(lower, least * (1.0 - ROUNDING) - shift)
                upper = min(upper, most * (1.0 + ROUNDING) - shift)
            if upper - lower <= gap * lower or upper < enough:
                return lower, upper, v
            rate, width = (most - least) / width if width < np.inf else 1.0, most - least
            np.multiply(image, 1.0 / top, out=v)
            np.maximum(v, 1e-280, out=v)
            shift = 0.5 * float(np.sqrt(lower * upper))
            if size > DENSE and step >= 3 and not _worth_waiting(rate, (upper - lower) / max(lower, 1e-300), gap, step):
                break
        if turn < ROUNDS:
            v = improved(rows, block, v)
            if size <= DENSE and turn > 1:
                break
    return lower, upper, v


def _worth_waiting(rate: float, width: float, gap: float, step: int) -> bool:
    """Whether power steps at the present rate will reach the gap soon."""
    if not 0.0 < rate < 1.0:
        return False
    return bool(step + np.log(gap / width) / np.log(rate) <= PATIENT_SWEEPS)


def _first_guess(rows: Rows, block: Block) -> Floats:
    size = block.high - block.low
    if int((rows.start[block.low + 1 : block.high + 1] - block.inner).sum()) > size:
        return np.ones(size)
    height = np.zeros(size)
    spreading.log_cycle(rows.start, rows.source, rows.weight, block.low, block.high, height)
    guess: Floats = np.exp(np.clip(height - 0.5 * (height.max() + height.min()), -600.0, 600.0))
    return guess


def _spread(rows: Rows, tied: Ints, gap: float) -> Floats:
    """The leading eigenvector by position: on the last in line of the tied components, carried on downstream."""
    vector, nothing = np.zeros(rows.n), np.zeros(rows.n)
    radius = 0.0
    for component in _last_in_line(rows, tied):
        low, high = (int(at) for at in rows.component_start[component : component + 2])
        if high - low > 1:
            _, upper, own = _bracket(rows, rows.block(int(component)), gap, enough=0.0)
            vector[low:high] = own / own.max()
        else:
            upper = float(rows.weight[rows.start[high] - 1]) if len(rows.weight) else 1.0
            vector[low] = 1.0
        radius = max(radius, upper)
    system = System(rows, 1.0 / radius, NO_WEIGHT)
    for component, end in zip(tied.tolist(), [*tied[1:].tolist(), None], strict=True):  # the tied keep what they have
        carry_on(system, vector, nothing, tolerance=1e-12, component=component + 1, before=end)
    first_end = int(rows.component_start[tied[-1] + 1])
    low = max(rows.sources, first_end)  # from here on nobody is a source, and nobody is a leading component
    if low < rows.n:
        in_parts(
            sweeping.sum_outside,
            np.array([0, rows.n - low], np.int64),
            rows.start,
            rows.start[low + 1 :].copy(),
            rows.source,
            rows.weight,
            vector,
            nothing,
            system.alpha,
            NO_WEIGHT,
            low,
            vector[low:],
        )
    top = float(vector.max())
    if not (0.0 < top < np.inf):
        raise ScoreError("the leading eigenvector left the range of floating-point numbers; scale the weights.")
    vector /= top
    return vector


_KNOWN: WeakKeyDictionary[Graph, dict[float, Brackets]] = WeakKeyDictionary()
