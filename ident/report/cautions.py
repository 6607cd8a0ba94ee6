"""Cautions: what must be said beside every proposal."""

CAUTIONS = (
    "A wrong setting can make a motor run away, hunt or trip, and hurt people. Only someone qualified and authorised "
    "for this machine changes its controller.",
    "Before any test or change: people clear of the machine, guards in place, emergency stop tried, speed and torque "
    "limits set in the drive.",
    "Write down the settings in use, change one step at a time, watch the loop after each, and be ready to go back.",
    "The figures hold for the machine, load and range of speed that the log shows. Another product, speed range, "
    "temperature or gearbox is another plant.",
    "Local codes, the manufacturer's instructions and licensed practice come before anything printed here.",
)
