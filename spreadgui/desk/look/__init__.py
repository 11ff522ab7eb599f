"""The look of the program: colours, sizes, drawings and the frame that every pane sits in."""
