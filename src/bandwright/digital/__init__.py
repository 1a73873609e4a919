"""Digital alloys: a graded layer or an alloy grown as pulses of its two ends.

`ends` finds the two ends and how much of each there is along a layer, `cells` cuts that into
pulses, `layers` puts them in the layer's place, `shifts` compares the levels of both stacks.
"""

from .cells import Pulse as Pulse
from .result import Digital as Digital
from .result import digital_alloy as digital_alloy
from .shifts import Shifts as Shifts
