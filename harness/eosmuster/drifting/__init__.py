"""What changed between two results folders, and why; and the only way to change a baseline."""
