"""The precheck command: what a plan stands on, checked before any sweep, and how it is shown."""
