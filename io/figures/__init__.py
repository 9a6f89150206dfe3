"""
Pictures of the statement as files.

Modules
-------
hodograph   the hodograph: the wind vectors of the lowest levels, the fitted spiral, the
            geostrophic wind
panels      the four panels over one height axis: speed, direction, departure and advection
profile_of  what the panels of one sheet share: a profile's levels in the units shown, and its
            models
rotor       what a turbine meets on one sheet: the rotor to scale beside the profiles, and veer
            over time
shear       low-level shear of one profile on one sheet, height in feet
sheet       one profile on one sheet: four panels over a shared height axis, the hodograph, the
            key numbers
style       the look of the pictures: colours, lines, and what keeps two runs alike to the byte
"""

SUFFIXES = (".svg", ".pdf", ".png")
