"""What actions, clicks and drags do: gestures into edits and questions."""
