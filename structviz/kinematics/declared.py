"""What a declaration says on the surface it stands on: the side that went down decides the dip-slip word of a steep fault."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import COMPASS_DEG, DIP_SLIP, Sector, sector_of_words

STEEP_DEG = 85.0  # from here on, which block hangs over the other is a convention (common practice)


def usable_sector(declared: Sector | None, down_side: str, normal: NDArray[np.float64], dip_deg: float) -> tuple[Sector | None, str]:
    """Return the sector that can be tested on a surface of this mean normal, and what was dropped or decided, in words.

    On a near-vertical fault a dip-slip word says nothing until the side that went down is named; then it is `normal` where
    that is the side the normal points to, else `reverse`. A strike-slip word needs no such help and stays.
    """
    if declared is None or not any(word in DIP_SLIP for word in declared.words):
        return declared, ""
    lateral = [word for word in declared.words if word not in DIP_SLIP]
    if dip_deg < STEEP_DEG:
        return declared, ""
    if not down_side:
        why = f"dips {dip_deg:.0f} deg: a dip-slip word needs the side that went down"
        return (sector_of_words(lateral[0]) if lateral else None), why
    azimuth = np.radians(COMPASS_DEG[down_side])
    hanging_wall_down = normal[0] * np.sin(azimuth) + normal[1] * np.cos(azimuth) > 0
    dip_slip = "normal" if hanging_wall_down else "reverse"
    words = [dip_slip if word in DIP_SLIP else word for word in declared.words]
    return sector_of_words("-".join(words)), f"{down_side} side down"
