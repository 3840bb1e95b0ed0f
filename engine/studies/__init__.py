"""Questions answered by batches of lanes: nominal, corners, spread, trials, causes, waves."""
