"""From a non-negative matrix to its Perron pair, its chain and its spectrum."""
