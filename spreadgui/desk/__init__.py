"""The Qt program: the window, its panes, its acts, and the pricing thread. The only room that imports Qt."""
