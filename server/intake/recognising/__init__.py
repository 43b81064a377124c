"""What a handed-in table is likely to mean: proposed with reasons, for the analyst to correct."""
