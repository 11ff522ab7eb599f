"""The editable grid of positions: cached cell texts, the Qt model, the editors, the painting, the pane."""
