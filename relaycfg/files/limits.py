"""Limits that say when an input looks wrong, and shares of the starter: our own choice, each with its reason."""

NOMINAL_V = (50.0, 600.0)
"""Line-to-neutral voltages of low-voltage systems, with room on both sides; above lies high voltage."""
LINE_TO_LINE_NEAR = 0.1
"""How near to the line-to-line voltage a figure looks like one: no-load voltages stand that far above nominal."""
ZIP_SUM_NEAR = 0.02
"""Printed shares are rounded to two decimals each; more than that is a slip."""
BAND_HIGHEST_PU = 3.0
"""No line-to-neutral voltage exceeds this; beyond it a load law says nothing."""
CONNECTED_TIMES = 3.0
"""Connected load over the source's rating from which on a slip is likely: diversity seldom explains more."""
