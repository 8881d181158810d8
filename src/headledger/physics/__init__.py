"""SI in, SI out: liquids, earth, friction, losses, networks, taps; each formula with its source."""
