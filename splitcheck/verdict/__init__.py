"""What a crossing means for the net that makes it: findings, levels, scores."""
