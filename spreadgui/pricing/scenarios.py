"""A book revalued in full under many scenarios, without the matrix of scenarios by positions.

Ten thousand scenarios of a thousand positions are ten million values, eighty megabytes for each intermediate result
of the formula; what is wanted of them is one total a scenario. The scenarios are cut into blocks, and within a block
the positions are taken a few at a time: their values are formed in the cache, weighted and added to the block's
totals, and the space is used again.

Positions lie down, scenarios across. Along a row of one position strike, volatilities and expiry are single numbers,
its two forwards are rows copied from the scenarios' contracts, and the normal distribution function, half of the
cost, finds neighbouring arguments on the same side of its branches, which spares it a fifth.

The values of one scenario are added one position after the other, in the order given, whatever the blocks; so neither
the cut nor the executor changes a digit.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from functools import partial
from importlib import import_module
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from spreadgui.pricing.blocks import Kernel, collect
from spreadgui.pricing.inputs import (
    LARGEST_AMOUNT,
    SMALLEST_FORWARD,
    Array,
    as_floats,
    check_correlation,
    check_finite,
    check_kind,
    check_not_negative,
    check_positive,
    check_strike,
)
from spreadgui.pricing.methods import Method

Indices = NDArray[np.intp]

# Measured beside 512 to 5,000 scenarios and 16 to 64 thousand values: flat for one thread, two threads like the larger
# number of values, and tasks of a thousand scenarios keep both evenly busy.
BLOCK_SCENARIOS = 1250
BLOCK_VALUES = 65536
# With rows shorter than this the calls for each row would cost more than columns written out at full length.
SHORT_ROW = 256


class Positions(NamedTuple):
    """Positions that have one kind in common, each field of shape (positions,) or one number for all.

    `long_contract` and `short_contract` are places in the contracts of the scenarios, counted from zero; a leg is its
    contract times the leg's ratio, above zero. `strike` is in money per unit of the payoff, volatilities (zero or
    above) and `correlation` (-1..1) annualised decimals, `expiry` in years, `discount` the factor from payment to
    today. `weight` is the quantity held in units of the payoff, below zero where sold.
    """

    long_contract: ArrayLike
    short_contract: ArrayLike
    strike: ArrayLike
    vol_long: ArrayLike
    vol_short: ArrayLike
    correlation: ArrayLike
    expiry: ArrayLike
    discount: ArrayLike = 1.0
    weight: ArrayLike = 1.0
    long_ratio: ArrayLike = 1.0
    short_ratio: ArrayLike = 1.0


class _Rows(NamedTuple):
    """Positions checked, each field of shape (positions, 1); the ratios None where every one is 1."""

    long_contract: Indices
    short_contract: Indices
    terms: tuple[Array, ...]
    weight: Array
    long_ratio: Array | None
    short_ratio: Array | None

    def part(self, start: int, stop: int) -> _Rows:
        cut = [None if ratio is None else ratio[start:stop] for ratio in (self.long_ratio, self.short_ratio)]
        terms = tuple(term[start:stop] for term in self.terms)
        contracts = self.long_contract[start:stop], self.short_contract[start:stop]
        return _Rows(*contracts, terms, self.weight[start:stop], *cut)


_CHECKS: dict[str, Callable[[str, Array], None]] = {
    "strike": check_strike,
    "vol_long": check_not_negative,
    "vol_short": check_not_negative,
    "correlation": check_correlation,
    "expiry": check_not_negative,
    "discount": check_not_negative,
    "weight": check_finite,
    "long_ratio": check_positive,
    "short_ratio": check_positive,
}


def _indices(name: str, given: ArrayLike, contracts: int) -> Indices:
    try:
        plain = np.asarray(given)
    except ValueError as fault:
        raise ValueError(f"{name}: expected whole numbers ({fault})") from fault
    if plain.dtype.kind not in "iu" and plain.size:
        raise ValueError(f"{name}: expected whole numbers, found {plain.dtype}")
    outside = (plain < 0) | (plain >= contracts)
    if outside.any():
        found = int(plain[outside].flat[0])
        raise ValueError(f"{name}: must be places among {contracts} contracts, found {found}")
    return plain.astype(np.intp)


def _check_reach(name: str, forwards: Array, ratio: Array) -> None:
    """Refuse ratios that take a leg's forward beyond what the formulas carry."""
    if forwards.size and ratio.size:
        low, high = forwards.min() * ratio.min(), forwards.max() * ratio.max()
        if low < SMALLEST_FORWARD or high > LARGEST_AMOUNT:
            bounds = f"between {SMALLEST_FORWARD:g} and {LARGEST_AMOUNT:g}"
            raise ValueError(f"{name}: ratio times forward must be {bounds}, found {low:g} to {high:g}")


def _count(positions: dict[str, Indices | Array]) -> int:
    """How many positions the fields hold; the first that does not fit those before it is named."""
    count: int | None = None
    for name, column in positions.items():
        if column.ndim > 1:
            raise ValueError(f"{name}: expected one number for each position, found shape {column.shape}")
        if column.ndim and count not in (None, column.size):
            raise ValueError(f"{name}: {column.size} numbers beside {count} positions in the fields before it")
        count = column.size if column.ndim else count
    return 1 if count is None else count


def _checked(forwards: Array, positions: Positions) -> _Rows:
    """The positions' fields, each looked at once at its own shape, then broadcast; `ValueError` naming the field."""
    given = positions._asdict()
    places = {name: _indices(name, given.pop(name), forwards.shape[1]) for name in ("long_contract", "short_contract")}
    columns = {name: as_floats(name, one) for name, one in given.items()}
    for name, column in columns.items():
        _CHECKS[name](name, column)
        if name.endswith("_ratio"):
            _check_reach(name, forwards, column)
    count = _count({**places, **columns})
    long, short = (np.broadcast_to(place, count) for place in places.values())
    down = {name: np.array(np.broadcast_to(column, count))[:, None] for name, column in columns.items()}
    weight, *ratios = (down.pop(name) for name in ("weight", "long_ratio", "short_ratio"))
    long_ratio, short_ratio = (None if np.all(ratio == 1.0) else ratio for ratio in ratios)
    return _Rows(long, short, tuple(down.values()), weight, long_ratio, short_ratio)


def _formula(method: Method, kind: str) -> tuple[Kernel, int] | None:
    """The method's own block kernel, where its module has one that takes rows as they lie here."""
    prepare: Callable[[str], tuple[Kernel, int]] | None = getattr(
        import_module(f"spreadgui.pricing.{method.key}"), "value_kernel", None
    )
    return None if prepare is None or kind == "forward" else prepare(kind)


def _leg(contracts: Array, places: Indices, ratio: Array | None) -> Array:
    leg: Array = contracts[places]
    if ratio is not None:
        leg *= ratio
    return leg


def _values(
    method: Method, kind: str, rows: _Rows, contracts: Array, formula: tuple[Kernel, int] | None, work: Array
) -> Array:
    """The weighted values of some positions in the scenarios of the block, (positions, scenarios)."""
    legs = (
        _leg(contracts, rows.long_contract, rows.long_ratio),
        _leg(contracts, rows.short_contract, rows.short_ratio),
    )
    if formula is None:
        return method.value(*legs, *rows.terms, kind=kind) * rows.weight
    # The kernel's last act is to discount; the weight goes along.
    terms = *rows.terms[:-1], rows.terms[-1] * rows.weight
    if contracts.shape[1] < SHORT_ROW:
        terms = tuple(np.repeat(term, contracts.shape[1], axis=1) for term in terms)
    values: Array = work[0]
    formula[0]((*legs, *terms), work[:1], work[1:])
    return values


def _add_rows(values: Array, out: Array) -> None:
    """Add the rows to `out` one after the other; the values are spent."""
    if values.shape[1] >= SHORT_ROW:
        for row in values:
            out += row
        return
    # A running sum adds in the same order, in one call. A plain sum would not: it pairs where rows hold one number.
    values[0] += out
    np.add.accumulate(values, axis=0, out=values)
    out[...] = values[-1]


def _total(method: Method, kind: str, rows: _Rows, forwards: Array, block_values: int, out: Array) -> None:
    """Totals of one block of scenarios into `out`, (scenarios,)."""
    formula = _formula(method, kind)
    contracts = np.ascontiguousarray(forwards.T)
    count, scenarios = len(rows.weight), contracts.shape[1]
    step = min(max(1, block_values // scenarios), count)
    work = np.empty((1 + (0 if formula is None else formula[1]), step, scenarios))
    out[...] = 0.0
    with np.errstate(all="ignore"):
        for start in range(0, count, step):
            part = rows.part(start, min(start + step, count))
            values = _values(method, kind, part, contracts, formula, work[:, : len(part.weight)])
            _add_rows(values, out)


def _totalled(method: Method, kind: str, rows: _Rows, forwards: Array, block_values: int) -> Array:
    """A task for executors that share no memory with the caller."""
    out = np.empty(len(forwards))
    _total(method, kind, rows, forwards, block_values, out)
    return out


def _run(
    total: Callable[[Array, int, Array], None],
    totalled: Callable[[Array, int], Array],
    forwards: Array,
    out: Array,
    executor: Executor | None,
    bounds: tuple[int, int],
) -> None:
    """Every block of scenarios into its part of `out`, inline or over the executor."""
    block_scenarios, block_values = bounds
    pending: list[tuple[Array, Future[Array]] | Future[None]] = []
    for start in range(0, len(out), block_scenarios):
        part, block = out[start : start + block_scenarios], forwards[start : start + block_scenarios]
        if executor is None:
            total(block, block_values, part)
        elif isinstance(executor, ThreadPoolExecutor):
            pending.append(executor.submit(total, block, block_values, part))
        else:
            pending.append((part, executor.submit(totalled, block, block_values)))
    collect(pending)


def totals(
    method: Method,
    forwards: ArrayLike,
    positions: Positions,
    *,
    kind: str = "call",
    executor: Executor | None = None,
    block_scenarios: int = BLOCK_SCENARIOS,
    block_values: int = BLOCK_VALUES,
) -> Array:
    """The book's value in every scenario: the sum over positions of weight times discounted value, (scenarios,).

    `forwards` are the contracts' forwards in every scenario, (scenarios, contracts), in money per unit of the contract
    and above zero. Every position is valued anew in every scenario by `method`, as `method.value` does with its
    `role_exchange` left alone; `kind` is "call", "put" or "forward", one for the whole call, so that a mixed book is
    the sum of up to three. Without positions the totals are zero. An `executor` is given blocks of scenarios; threads
    fill the result in place, other executors return theirs. `block_scenarios` and `block_values` bound what is under
    way at once, and change no digit.

    Raises `ValueError` naming the argument or the field of `positions` for numbers outside the bounds given here and
    in `Positions`, for places that are no contract's, for fields whose lengths differ, and for strikes the method does
    not accept. Peak memory beside forwards and result: a few megabytes for each thread.

    >>> from spreadgui.pricing.methods import method
    >>> book = Positions([0, 1], [1, 0], 5.0, 0.3, 0.4, 0.5, 1.0, weight=[2.0, -1.0])
    >>> totals(method("kirk"), [[112.0, 103.0], [100.0, 103.0]], book).round(4).tolist()
    [25.3234, 8.0498]
    """
    check_kind(kind)
    numbers = as_floats("forwards", forwards)
    if numbers.ndim != 2:
        raise ValueError(f"forwards: expected shape (scenarios, contracts), found {numbers.shape}")
    check_positive("forwards", numbers)
    rows = _checked(numbers, positions)
    if not np.all(method.accepts(rows.terms[0])):
        raise ValueError(f"strike: not every strike is one that {method.name} accepts")
    for name, bound in (("block_scenarios", block_scenarios), ("block_values", block_values)):
        if bound < 1:
            raise ValueError(f"{name}: must be at least 1, found {bound}")
    out = np.zeros(len(numbers))
    if len(rows.weight):
        tasks = partial(_total, method, kind, rows), partial(_totalled, method, kind, rows)
        _run(*tasks, numbers, out, executor, (block_scenarios, block_values))
    return out
