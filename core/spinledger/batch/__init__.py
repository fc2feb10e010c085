"""Jobs from raw data to written reports, one by one or by the table."""
