"""The result in the forms that leave the lab."""
