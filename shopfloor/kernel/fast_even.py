# mypy: allow-untyped-defs, allow-untyped-calls, no-check-untyped-defs
# (numba infers the types of the compiled functions from the signatures above them)
"""The evening-out of `equitable`, compiled with numba: the same swaps in the same order."""

from __future__ import annotations

import numba
import numpy as np

from shopfloor.kernel.fast import COLUMN, INT, OUT, compiled

__all__ = ["even_out"]


@compiled(numba.void(COLUMN, COLUMN, INT, INT, OUT, INT))
def even_out(left, right, left_nodes, right_nodes, colours, rounds):
    """Change the colours in place until their classes differ in size by one at most."""
    edges = len(colours)
    start = np.zeros(rounds + 2, dtype=np.int64)
    for edge in range(edges):
        start[colours[edge] + 2] += 1
    largest = start.max()

    # Classes, fullest first, by counting how many are fuller.
    fuller = np.zeros(largest + 2, dtype=np.int64)
    for name in range(rounds):
        fuller[largest - start[name + 2] + 1] += 1
    for size in range(1, largest + 2):
        fuller[size] += fuller[size - 1]
    by_size = np.empty(rounds, dtype=np.int64)
    surplus = np.empty(rounds, dtype=np.int64)
    for name in range(rounds):
        size = start[name + 2]
        place = fuller[largest - size]
        fuller[largest - size] += 1
        by_size[place] = name
        surplus[place] = size - edges // rounds - (1 if place < edges % rounds else 0)

    for name in range(rounds):
        start[name + 2] += start[name + 1]
    members = np.empty(edges, dtype=np.uint32)
    for edge in range(edges):
        members[start[colours[edge] + 1]] = edge
        start[colours[edge] + 1] += 1

    # An edge in these tables counts only if it still has the colour of the class the table is for.
    a_left = np.full(left_nodes, -1, dtype=np.int32)
    b_left = np.full(left_nodes, -1, dtype=np.int32)
    b_right = np.full(right_nodes, -1, dtype=np.int32)
    nodes = np.empty(largest, dtype=np.uint32)
    poor = rounds
    lack = np.int64(0)
    b = np.int64(-1)
    for full in range(rounds):
        over = surplus[full]
        if over <= 0:
            continue
        a = by_size[full]
        count = start[a + 1] - start[a]
        for place in range(count):
            edge = members[start[a] + place]
            nodes[place] = left[edge]
            a_left[left[edge]] = edge
        while over > 0:
            if lack == 0:
                poor -= 1
                while surplus[poor] >= 0:
                    poor -= 1
                b = by_size[poor]
                lack = -surplus[poor]
                if start[b] == start[b + 1] and lack <= over:
                    for place in range(count - lack, count):
                        colours[a_left[nodes[place]]] = b
                    count -= lack
                    over -= lack
                    lack = np.int64(0)
                    continue
                for place in range(start[b], start[b + 1]):
                    edge = members[place]
                    b_left[left[edge]] = edge
                    b_right[right[edge]] = edge
            here = 0
            while over > 0 and lack > 0:
                node = nodes[here]
                if b_left[node] >= 0 and colours[b_left[node]] == b:
                    here += 1
                    continue
                edge = a_left[node]
                odd = True
                while True:
                    after = b_right[right[edge]]
                    if after < 0 or colours[after] != b:
                        break
                    edge = a_left[left[after]]
                    if edge < 0 or colours[edge] != a:
                        odd = False
                        break
                if not odd:
                    here += 1
                    continue
                edge = a_left[node]
                while True:
                    after = b_right[right[edge]]
                    colours[edge] = b
                    b_left[left[edge]] = edge
                    b_right[right[edge]] = edge
                    if after < 0 or colours[after] != b:
                        break
                    edge = a_left[left[after]]
                    colours[after] = a
                    a_left[left[after]] = after
                nodes[here] = nodes[count - 1]
                count -= 1
                over -= 1
                lack -= 1
