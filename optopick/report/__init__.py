"""What people and programs read: terminal text, JSON. Nothing here prints."""
