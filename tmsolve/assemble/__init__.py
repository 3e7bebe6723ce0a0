"""From a declaration to windows and matrices: the one bridge between physics and mathematics."""
