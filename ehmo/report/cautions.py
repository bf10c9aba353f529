"""What every report says about its own limits and about handling the compounds."""

from __future__ import annotations

CAUTIONS = (
    "Extended-Hückel numbers support measurement and never replace it; compare like with like and trust trends "
    "before single values.",
    "Many high-valent oxo compounds are volatile, oxidising, carcinogenic or radioactive: handling follows the "
    "safety data sheet, local rules and licensed practice.",
)
