"""The sheets of the signed workbook: each module makes one of them, or what several of them share."""
