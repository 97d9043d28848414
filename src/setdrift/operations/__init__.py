"""What surrounds the stages: inventory, verification, and running a stage from its name."""
