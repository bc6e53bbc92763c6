"""What a checker needs of a workbook: verify, seal, compare."""
