"""An invented low-temperature group's own steps, checks, readers and plans."""
