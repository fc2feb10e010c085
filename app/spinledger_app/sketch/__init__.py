"""Structure editor: pure drawings and gestures, and the widget that shows them."""
