# mypy: allow-untyped-defs, allow-untyped-calls, no-check-untyped-defs
# (numba infers the types of the compiled functions from the signatures above them)
"""The colouring of `colouring`, compiled with numba: the same steps in the same order, so the same colours.

This module is imported only where numba is installed and the graph is large, or on request. It keeps sets
of free colours in 64-bit words instead of Python integers and every table in a flat array, 16 bits a cell
if the groups can be told apart by so few. For what is done and why, read `colouring`. Extra memory is 24 to
32 bytes an edge, the returned array included.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numba
import numpy as np
from llvmlite import ir  # type: ignore[import-untyped,import-not-found,unused-ignore]
from numba.extending import intrinsic

from shopfloor.kernel.multigraph import SPARSE, SPARSE_FROM, IntArray, compact

__all__ = ["COLUMN", "INT", "OUT", "colour_rows", "compiled"]

Compiled = Callable[..., Any]

INT = numba.int64
# A column that NumPy holds read-only is a type of its own to numba, and a writable one can stand in for it.
COLUMN = numba.types.Array(INT, 1, "C", readonly=True)
OUT = numba.types.Array(INT, 1, "C")
_PAIR = numba.types.UniTuple(INT, 2)
_COUNTS = numba.uint32[::1]
_NARROW = numba.int16[::1]
_WIDE = numba.int32[::1]
_ALL = np.uint64(0xFFFFFFFFFFFFFFFF)
_ONE = np.uint64(1)
_ODD = np.uint64(0x9E3779B97F4A7C15)
_MIX_1 = np.uint64(0xBF58476D1CE4E5B9)
_MIX_2 = np.uint64(0x94D049BB133111EB)


def compiled(*signatures: Any) -> Callable[[Compiled], Compiled]:
    """Compile for these signatures: on disk if some folder takes the compiled code, else in memory."""

    def compile_it(function: Compiled) -> Compiled:
        try:
            return numba.njit(list(signatures), cache=True, nogil=True)(function)
        except (
            RuntimeError,
            OSError,
        ):  # neither the package's own cache folder nor the user's can be written
            return numba.njit(list(signatures), nogil=True)(function)

    return compile_it


@intrinsic
def _lowest(_context: Any, word: Any) -> Any:
    """Return the place of the lowest 1 in a 64-bit word, 64 if there is none."""

    def generate(_target: Any, builder: Any, _signature: Any, arguments: Any) -> Any:
        return builder.cttz(arguments[0], ir.Constant(ir.IntType(1), 0))

    return INT(numba.uint64), generate


def colour_rows(
    left: IntArray, right: IntArray, seed: int, budget: int, candidates: int
) -> tuple[IntArray | None, int]:
    """Colour, with the rows in one order; return the colours, None if the budget ran out, and the path steps.

    Raises ValueError on a negative node number.
    """
    colours = np.empty(len(left), dtype=np.int64)
    seed &= 0xFFFFFFFFFFFFFFFF
    limit = SPARSE * len(left) + SPARSE_FROM
    done, steps = _colour(left, right, seed, budget, candidates, limit, colours)
    if done < 0:
        left, right = compact(left, "left")[0], compact(right, "right")[0]
        done, steps = _colour(left, right, seed, budget, candidates, limit, colours)
    return (colours if done else None), steps


@compiled(INT(_COUNTS, INT))
def _fold(degree, cap):
    """Replace each node's degree by its group (next fit) and return the number of groups."""
    group = 0
    held = 0
    for node in range(len(degree)):
        here = np.int64(degree[node])
        held += here
        if held > cap:
            group += 1
            held = here
        degree[node] = group
    return group + 1


@compiled(_COUNTS(INT, numba.uint64))
def _shuffled(count, seed):
    """Do as `multigraph.shuffled`."""
    bits = 2
    while (1 << bits) < count:
        bits += 1
    mask = (_ONE << np.uint64(bits)) - _ONE
    half = np.uint64((bits + 1) // 2)
    keys = np.empty(4, dtype=np.uint64)
    for turn in range(4):
        seed += _ODD
        key = (seed ^ (seed >> np.uint64(30))) * _MIX_1
        key = (key ^ (key >> np.uint64(27))) * _MIX_2
        keys[turn] = key ^ (key >> np.uint64(31))
    order = np.empty(count, dtype=np.uint32)
    filled = 0
    for start in range(1 << bits):
        number = np.uint64(start)
        for turn in range(4):
            number = ((number + keys[turn]) * _ODD) & mask
            number ^= number >> half
        if number < np.uint64(count):
            order[filled] = number
            filled += 1
    return order


@compiled(numba.void(COLUMN, COLUMN, _COUNTS, _COUNTS, _WIDE, _WIDE, INT, _COUNTS, _COUNTS, _COUNTS))
def _sort(left, right, left_group, right_group, one, two, columns, row_start, edge_of, end_of):
    """Sort the edges by left group and then right group: two counting sorts, the second one first.

    Fills in where each row starts, the edge at each place, and the right group of each place.
    """
    edges = len(left)
    column_start = np.zeros(columns + 2, dtype=np.uint32)
    for edge in range(edges):
        row_start[left_group[np.uint64(left[edge])] + 2] += np.uint32(1)
        column_start[right_group[np.uint64(right[edge])] + 2] += np.uint32(1)
    for u in range(2, len(row_start)):
        row_start[u] += row_start[u - 1]
    for v in range(2, columns + 2):
        column_start[v] += column_start[v - 1]
    for edge in range(edges):
        v = right_group[np.uint64(right[edge])] + 1
        place = column_start[v]
        column_start[v] = place + np.uint32(1)
        one[place] = edge
        two[place] = left_group[np.uint64(left[edge])]
    for v in range(columns):
        for place in range(column_start[v], column_start[v + 1]):
            u = np.uint32(two[place]) + 1
            target = row_start[u]
            row_start[u] = target + np.uint32(1)
            edge_of[target] = one[place]
            end_of[target] = v


@compiled(
    INT(_NARROW, _NARROW, _COUNTS, _COUNTS, _COUNTS, INT, INT, INT, INT),
    INT(_WIDE, _WIDE, _COUNTS, _COUNTS, _COUNTS, INT, INT, INT, INT),
)
def _colour_rows(at_left, at_right, order, row_start, end_of, delta, columns, budget, candidates):
    """Fill in both tables of groups by group and colour; return the steps, above budget if given up."""
    words = (delta + 63) >> 6
    last = _ALL >> np.uint64((words << 6) - delta)
    free = np.empty((columns, words), dtype=np.uint64)
    free[:] = _ALL
    free[:, words - 1] = last
    free_u = np.empty(words, dtype=np.uint64)
    run_start = np.empty(min(delta, columns) + 1, dtype=np.int64)
    candidate = np.empty(candidates, dtype=np.int64)
    tip = np.empty(candidates, dtype=np.int64)
    steps = 0
    for u_ in order:
        u = np.int64(u_)
        row = u * delta
        runs = 0
        previous = np.int64(-1)
        for place in range(row_start[u], row_start[u + 1]):
            v = np.int64(end_of[place])
            if v != previous:
                run_start[runs] = place
                runs += 1
                previous = v
        run_start[runs] = row_start[u + 1]
        free_u[:] = _ALL
        free_u[words - 1] = last
        lowest_word = 0
        turn = runs * u // len(order)
        for turned in range(turn, turn + runs):
            run = turned if turned < runs else turned - runs
            place = run_start[run]
            size = run_start[run + 1] - place
            v = np.int64(end_of[place])
            column = v * delta
            while lowest_word < words - 1 and free_u[lowest_word] == 0:
                lowest_word += 1
            for word in range(lowest_word, words):
                common = free_u[word] & free[v, word]
                while common != 0 and size > 0:
                    first = _lowest(common)
                    width = 1
                    bits = common & (~common + _ONE)
                    if size > 1:
                        width = min(_lowest(~(common >> np.uint64(first))), size)
                        bits = (_ALL >> np.uint64(64 - width)) << np.uint64(first)
                    free_u[word] ^= bits
                    free[v, word] ^= bits
                    common ^= bits
                    first += word << 6
                    for colour in range(first, first + width):
                        at_left[row + colour] = v
                        at_right[column + colour] = u
                    size -= width
                if size == 0:
                    break
            for _ in range(size):
                word_a = lowest_word
                while free_u[word_a] == 0:
                    word_a += 1
                word_b = 0
                while free[v, word_b] == 0:
                    word_b += 1
                bit_b = free[v, word_b] & (~free[v, word_b] + _ONE)
                b = (word_b << 6) + _lowest(bit_b)
                # Several colours free at u are side by side; see colouring._shortest_trail.
                found = 0
                for word in range(word_a, words):
                    rest = free_u[word]
                    while rest != 0 and found < candidates:
                        candidate[found] = (word << 6) + _lowest(rest)
                        tip[found] = at_right[column + candidate[found]]
                        found += 1
                        rest &= rest - _ONE
                    if found == candidates:
                        break
                winner = 0 if found == 1 else -1
                while winner < 0:
                    steps += 2 * found
                    # No early exit: the reads of different trails must be able to overlap in the processor.
                    for i in range(found):
                        after = np.int64(at_left[tip[i] * delta + b])
                        tip[i] = at_right[max(after, 0) * delta + candidate[i]]
                        if winner < 0 and (after < 0 or tip[i] < 0):
                            winner = i
                a = candidate[winner]
                word_a = a >> 6
                bit_a = _ONE << np.uint64(a & 63)
                free_u[word_a] ^= bit_a
                free[v, word_b] ^= bit_b
                at_left[row + a] = v
                # Swap a and b along the trail from v.
                z = v
                y = np.int64(at_right[column + a])
                at_right[column + a] = u
                while True:
                    at_right[z * delta + b] = y
                    after = np.int64(at_left[y * delta + b])
                    at_left[y * delta + b] = z
                    steps += 1
                    if after < 0:
                        at_left[y * delta + a] = -1
                        break
                    z = after
                    at_left[y * delta + a] = z
                    steps += 1
                    after = np.int64(at_right[z * delta + a])
                    at_right[z * delta + a] = y
                    if after < 0:
                        at_right[z * delta + b] = -1
                        free[z, word_a] ^= bit_a
                        free[z, word_b] ^= bit_b
                        break
                    y = after
                if steps > budget:
                    return steps
    return steps


@compiled(
    numba.void(_NARROW, _COUNTS, _COUNTS, _COUNTS, INT, INT, INT, OUT),
    numba.void(_WIDE, _COUNTS, _COUNTS, _COUNTS, INT, INT, INT, OUT),
)
def _hand_out(at_left, row_start, edge_of, end_of, delta, rows, columns, colours):
    """Give each row's colours, lowest first, to its edges in order of right group."""
    cursor = np.empty(columns, dtype=np.uint32)
    for u in range(rows):
        previous = np.int64(-1)
        for place in range(row_start[u], row_start[u + 1]):
            v = np.int64(end_of[place])
            if v != previous:
                cursor[v] = place
                previous = v
        for colour in range(delta):
            v = np.int64(at_left[u * delta + colour])
            if v >= 0:
                colours[edge_of[cursor[v]]] = colour
                cursor[v] += np.uint32(1)


@compiled(_PAIR(COLUMN, COLUMN, numba.uint64, INT, INT, INT, OUT))
def _colour(left, right, seed, budget, candidates, limit, colours):
    """Fill in the colours; return 1 if done, 0 if out of budget, -1 if numbers are sparse or negative."""
    edges = len(left)
    least = np.int64(0)
    left_top = np.int64(0)
    right_top = np.int64(0)
    for edge in range(edges):
        least = min(least, left[edge], right[edge])
        left_top = max(left_top, left[edge])
        right_top = max(right_top, right[edge])
    if least < 0 or left_top >= limit or right_top >= limit:
        return -1, 0

    left_group = np.zeros(left_top + 1, dtype=np.uint32)
    right_group = np.zeros(right_top + 1, dtype=np.uint32)
    for edge in range(edges):
        left_group[np.uint64(left[edge])] += np.uint32(1)
        right_group[np.uint64(right[edge])] += np.uint32(1)
    delta = np.int64(max(left_group.max(), right_group.max()))
    rows = _fold(left_group, delta)
    columns = _fold(right_group, delta)

    edge_of = np.empty(edges, dtype=np.uint32)
    end_of = np.empty(edges, dtype=np.uint32)
    row_start = np.zeros(rows + 2, dtype=np.uint32)
    order = _shuffled(rows, seed)
    # The tables to come lend their memory to the sorting. Each cell of a table holds a group, or -1.
    narrow = max(rows, columns) < 1 << 15
    share = 2 if narrow else 1
    one = np.empty(max(edges, (rows * delta) // share + 1), dtype=np.int32)
    two = np.empty(max(edges, (columns * delta) // share + 1), dtype=np.int32)
    _sort(left, right, left_group, right_group, one, two, columns, row_start, edge_of, end_of)
    one[:] = -1
    two[:] = -1
    if narrow:
        at_left = one.view(np.int16)
        steps = _colour_rows(
            at_left, two.view(np.int16), order, row_start, end_of, delta, columns, budget, candidates
        )
        if steps <= budget:
            _hand_out(at_left, row_start, edge_of, end_of, delta, rows, columns, colours)
    else:
        steps = _colour_rows(one, two, order, row_start, end_of, delta, columns, budget, candidates)
        if steps <= budget:
            _hand_out(one, row_start, edge_of, end_of, delta, rows, columns, colours)
    return int(steps <= budget), steps
