"""Where the answers can hurt: said in print, in JSON and in the README, in the same words."""

GENERAL = (
    "These are computations from one profile. They support and do not replace official aviation "
    "warnings, licensed practice and local codes."
)
AVIATION = (
    "Official warnings and pilot reports come first. A single profile does not see convective or "
    "terrain-induced shear. Local criteria and licensed forecasters decide."
)
TURBINE = (
    "Not a guarantee of load or energy. The standards' own procedures and licensed practice decide."
)
