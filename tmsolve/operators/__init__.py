"""Windows of a chain, the algebras they are summed in, and products: mathematics without physics."""
