"""Zero temperature: ground states, residual entropies and phase diagrams in exact arithmetic."""
