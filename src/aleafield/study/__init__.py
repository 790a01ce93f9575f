"""What a study says: the records, the study file and its reader, studies built in Python."""
