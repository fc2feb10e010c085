"""The document that is saved, its pure edits, storage and audit trail."""
