"""What the user describes: conductors, their places, the surroundings; checks between bodies."""
