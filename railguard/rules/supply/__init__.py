"""Supply: there, the right way round, inside what the device allows, at the level it says."""
