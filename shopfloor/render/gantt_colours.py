"""Fills that stay apart for every eye and in grey print: by lateness, and by family.

Neighbouring fills differ in brightness by a third or more, each has a pattern of its own, and text on a
fill reaches contrast 7 (WCAG 2.2, level AAA); a test holds them to that.
"""

from __future__ import annotations

import numpy as np

from shopfloor.model.shop import Ints
from shopfloor.render.gantt_view import ColourGroup, Family

INK, BLACK, WHITE = "#10202f", "#000000", "#ffffff"

# In the order of the index that bars carry. Brightness (CIE L*, about): 73, 36, 90. The pair light blue
# and dark vermilion stays apart under every common kind of colour blindness.
BY_LATENESS = (
    ColourGroup("on time", "#93bfe2", INK, "plain"),
    ColourGroup("late", "#9c3412", WHITE, "stripes"),
    ColourGroup("no due time", "#e6e2d8", INK, "dots"),
)
ON_TIME, LATE, NO_DUE_TIME = range(3)
# Where no order has a due time there is nothing to tell apart, and a pattern would only make noise.
ALL_ALIKE = (ColourGroup("no due time", "#93bfe2", INK, "plain"),)

# Fill, ink and pattern of the families with most work, the first five of them; L* 84, 37, 74, 64, 25.
_FAMILY_LOOKS = (
    ("#edd084", INK, "dots"),
    ("#1a6068", WHITE, "stripes"),
    ("#97bf97", INK, "back-stripes"),
    ("#d3885f", BLACK, "upright"),
    ("#4c2b72", WHITE, "grid"),
)
_NO_FAMILY = ("#f2f4f5", INK, "plain")


def by_family(names: tuple[str, ...], family: Ints, work_s: Ints) -> tuple[list[Family], list[ColourGroup]]:
    """Return the families as the page has them, and their colour groups.

    Parameters
    ----------
    names
        Family names; the last is "", no family.
    family, work_s
        Of each run: index into `names`, and how much work it is.

    Returns
    -------
    families, groups
        An entry for each name. The families with most work have a fill each; where there are more than
        fills, the rest share the last one.
    """
    work = np.bincount(family, weights=work_s, minlength=len(names)).astype(np.int64)
    used = [index for index in np.lexsort((np.arange(len(names)), -work)).tolist() if work[index]]
    named = [index for index in used if names[index]]
    own = len(named) if len(named) <= len(_FAMILY_LOOKS) else len(_FAMILY_LOOKS) - 1
    groups = [ColourGroup(names[index], *_FAMILY_LOOKS[rank]) for rank, index in enumerate(named[:own])]
    place = {index: rank for rank, index in enumerate(named[:own])}
    if named[own:]:
        groups.append(ColourGroup(f"{len(named) - own:,} other families", *_FAMILY_LOOKS[-1]))
        place |= dict.fromkeys(named[own:], own)
    if len(used) > len(named) or not groups:
        groups.append(ColourGroup("no family", *_NO_FAMILY))
    return [Family(name, place.get(index, len(groups) - 1)) for index, name in enumerate(names)], groups
