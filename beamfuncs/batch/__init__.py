"""Many beams at once: columns of beams solved together in array arithmetic."""

from beamfuncs.batch.sweeping import Swept as Swept
from beamfuncs.batch.sweeping import sweep as sweep
from beamfuncs.batch.sweeping import sweep_over as sweep_over
