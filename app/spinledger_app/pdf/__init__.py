"""The report as PDF: the bench's own drawing on A4 pages."""
