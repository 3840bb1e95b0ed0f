"""Pure calculation: design document to circuit, lanes, observations, margins. No files, clock, database or screen."""
