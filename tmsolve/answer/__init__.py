"""The verb solve."""
