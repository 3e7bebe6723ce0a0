"""Closed forms: what a transfer matrix says about itself when its entries stay symbols."""
