"""The outside check of the margins: every model worked again by small steps and fine samples."""
