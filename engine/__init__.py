"""Pure calculation: design document to circuit, lanes, observations and margins. No files, clock, database or screen."""
