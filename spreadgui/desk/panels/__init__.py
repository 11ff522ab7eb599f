"""Panes of words and numbers beside the grid: the Reading."""
