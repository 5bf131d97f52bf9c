"""What must not be forgotten at the bench. One place, so that every output says the same."""

#: One line under every result on a terminal.
CAUTION = (
    "Predictions are estimates: verify on a dyno and ride cautiously first. Release gas pressure "
    "and springs by the maker's service procedure; wear eye protection."
)

#: The full list, for sheets.
CAUTIONS = (
    "Gas pressure: let it off by the maker's procedure before anything is opened.",
    "Springs store energy: use a compressor made for the part, and never stand in line with it.",
    "Wear eye protection and gloves; hot oil burns, and oil on a brake or a floor is dangerous.",
    "Follow the damper maker's service procedure, torques and wear limits; this tool knows none.",
    "Charging gas and work on a road vehicle may be reserved for a qualified workshop; local rules "
    "hold.",
    "Collect old oil and dispose of it by local rules.",
    "Predictions are estimates: verify on a dyno before riding.",
    "Ride cautiously first, on known ground, and stop when anything feels or sounds wrong.",
)
